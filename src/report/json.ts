import type { StillmarkDocument } from '../jobs/document.js'

/**
 * The document as other programs read it; numbers keep all their digits. Characters that would steer a terminal or turn
 * the direction of writing are written as escapes, so that a stranger's title is harmless on a screen too.
 */
export const toJson = (document: StillmarkDocument, indented: boolean): string =>
  JSON.stringify(document, null, indented ? 2 : undefined).replace(
    /[\u007F-\u009F\u200B-\u200F\u2028-\u202E\u2060-\u2069\uFEFF]/g,
    (character) => `\\u${character.charCodeAt(0).toString(16).padStart(4, '0')}`,
  )
