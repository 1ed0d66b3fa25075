import type { JobResult } from '../jobs/job-result.js'
import { plainText } from './plain-text.js'

/** What to do now, one or two sentences; "nothing." where there is nothing. */
export function nextAction({ document, details }: JobResult): string {
  const { expect, next } = details
  const found = document.structure?.recurrence
  if (next !== 'nothing') return plainText(next, 400)
  if (expect !== undefined && found !== undefined && found !== 'undetermined' && !isMet(expect, document.structure))
    return `correct "expect" in the file, or the model: they contradict each other.`
  return 'nothing.'
}

/** Whether what the file expects is what was found. */
export const isMet = (expect: string, structure: JobResult['document']['structure']): boolean =>
  expect === structure?.recurrence || (expect === 'explosive' && structure?.explosive === true)
