import type { StillmarkDocument } from '../jobs/document.js'

/** The answer in a sentence or two: what a reader who stops there takes along. */
export function verdictSentence({ comparison, structure, exact }: StillmarkDocument): string {
  if (comparison === undefined) return ''
  const measures = Object.values(comparison.measures)
  const claims = Object.values(comparison.claims)
  const off = Object.entries(comparison.measures).filter(([, each]) => each.verdict === 'disagrees')
  const claimsOff = Object.entries(comparison.claims).filter(([, each]) => each.verdict === 'disagrees')
  const unsure = Object.entries(comparison.measures).filter(([, each]) => each.verdict === 'undecided')
  if (comparison.verdict === 'no steady state')
    return `There is no steady state: the model is ${structure?.recurrence}.`
  if (structure?.recurrence === 'undetermined')
    return 'It is open whether this model has a long-run answer, so nothing can be compared.'
  if (exact === null) return 'There is no exact answer to compare the simulation with.'
  const claimed = claims.length === 0 ? '' : claims.length === 1 ? 'the claim' : `the ${claims.length} claims`
  if (off.length > 0) {
    const claimPart = claimsOff.length > 0 ? `, and ${claimPhrase(claimsOff, claims.length)}` : ''
    return `The simulation disagrees with the exact long-run answer in ${names(off)}${claimPart}.`
  }
  if (claimsOff.length > 0) {
    const simulation =
      unsure.length > 0
        ? 'The run is too short to judge the simulation'
        : 'The simulation agrees with the exact long-run answer'
    return `${simulation}, but ${claimPhrase(claimsOff, claims.length)}.`
  }
  if (unsure.length > 0)
    return `Undecided: the run does not show whether ${names(unsure)} ${unsure.length === 1 ? 'agrees' : 'agree'} with the exact answer.`
  if (comparison.verdict === 'undecided') return 'Undecided: not every claim can be judged.'
  if (measures.length === 0)
    return claims.length === 0
      ? 'The scenario asks for no measures: there is nothing to compare.'
      : `${capital(claimed)} ${claims.length === 1 ? 'agrees' : 'agree'} with the exact long-run answer.`
  return `The simulation agrees with the exact long-run answer${claims.length === 0 ? '' : `, and so ${claims.length === 1 ? 'does' : 'do'} ${claimed}`}.`
}

const claimPhrase = (off: readonly (readonly [string, unknown])[], all: number): string =>
  off.length === 1
    ? all === 1
      ? 'the claim is off'
      : `the claim about ${off[0][0]} is off`
    : `${off.length} of ${all} claims are off`

function names(entries: readonly (readonly [string, unknown])[]): string {
  const list = entries.map(([name]) => name)
  if (list.length > 3) return `${list.slice(0, 3).join(', ')} and ${list.length - 3} more`
  return list.length < 2 ? list.join('') : `${list.slice(0, -1).join(', ')} and ${list[list.length - 1]}`
}

const capital = (text: string): string => text.charAt(0).toUpperCase() + text.slice(1)
