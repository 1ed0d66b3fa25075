import type { StillmarkDocument } from '../jobs/document.js'
import type { JobDetails } from '../jobs/job-result.js'
import { amount, countInWords, inUnits, significant, trimZeros } from './digits.js'
import { isMet } from './next-action.js'
import { plainText } from './plain-text.js'

/** The lines under the table: what the verdict rests on. Label and text. */
export function factLines(
  { structure, simulation, exact }: StillmarkDocument,
  details: JobDetails,
): readonly (readonly [string, string])[] {
  const lines: (readonly [string, string])[] = []
  if (structure !== undefined) {
    const { recurrence, grade, basis } = structure
    const steady =
      recurrence === 'positive recurrent'
        ? 'yes'
        : recurrence === 'mixed'
          ? 'not always'
          : recurrence === 'undetermined'
            ? 'open'
            : 'no'
    const head = recurrence === 'undetermined' ? steady : `${steady}, ${grade}`
    lines.push(['steady state', `${head}: ${basis}`])
    if (structure.closedClasses.length > 1) {
      const shown = structure.closedClasses
        .slice(0, 5)
        .map(
          ({ reachedWith, size }) =>
            `${reachedWith === null ? 'unknown' : trimZeros(significant(reachedWith, 4))} in ${size === null ? 'an endless' : size === 1 ? 'a single-state' : `a ${size.toLocaleString('en-US')}-state`} class`,
        )
      lines.push(['ends', `with probability ${shown.join(', ')}${structure.closedClasses.length > 5 ? ', …' : ''}`])
    }
    if (structure.meanTimeToSettle !== null && structure.meanTimeToSettle > 0) {
      lines.push(['settles', `after ${inUnits(structure.meanTimeToSettle, unitOf(details))} on average`])
    }
  }
  if (details.expect !== undefined && structure !== undefined) {
    const found =
      structure.recurrence === 'undetermined'
        ? 'that stays open'
        : isMet(details.expect, structure)
          ? 'and so it is'
          : `but it is ${structure.recurrence}`
    lines.push(['expected', `${plainText(details.expect)}, ${found}`])
  }
  if (exact !== undefined && exact !== null) lines.push(['exact by', exact.method])
  if (simulation !== undefined) {
    const { warmUp, runLength, replications, seed, events, seconds } = simulation
    const unit = unitOf(details)
    const part = warmUp === 0 ? 'none' : `${inUnits(warmUp, unit)} deleted before the ${amount(runLength)} observed`
    lines.push([
      'warm-up',
      `${part}${details.warmUpBasis === undefined || details.warmUpBasis === 'as given' ? ', as given' : `; ${details.warmUpBasis}`}`,
    ])
    lines.push([
      'run',
      `${replications} ${replications === 1 ? 'replication' : 'replications'} of ${inUnits(runLength, unit)}, seed ${plainText(seed, 40)}, ${countInWords(events)} events, ${seconds < 0.1 ? 'under 0.1' : significant(seconds, seconds < 10 ? 2 : 3)} s`,
    ])
  }
  return lines
}

const unitOf = ({ unit }: JobDetails): string => plainText(unit, 30)
