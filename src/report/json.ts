import type { StillmarkDocument } from '../jobs/document.js'

/** The document as other programs read it; numbers keep all their digits. */
export const toJson = (document: StillmarkDocument, indented: boolean): string =>
  JSON.stringify(document, null, indented ? 2 : undefined)
