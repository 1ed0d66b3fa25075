import type { StillmarkDocument } from '../jobs/document.js'
import type { JobDetails } from '../jobs/job-result.js'
import { isMet } from './next-action.js'

/** The answer in a sentence or two: what a reader who stops there takes along. */
export function verdictSentence(document: StillmarkDocument, { expect }: Pick<JobDetails, 'expect'>): string {
  const sentence = document.comparison === undefined ? structureSentence(document) : comparisonSentence(document)
  const { structure } = document
  if (expect === undefined || structure === undefined || structure.recurrence === 'undetermined') return sentence
  if (!isMet(expect, structure))
    return `The model is ${structure.recurrence}, not ${expect} as the file expects. ${sentence}`
  return expect === 'positive recurrent' ? sentence : `${sentence} That is what the file expects.`
}

/** Of commands that compare nothing: what is known of the long run. */
function structureSentence({ format, structure, exact, simulation }: StillmarkDocument): string {
  if (structure === undefined) return ''
  const { recurrence, closedClasses } = structure
  const reached = closedClasses.filter((each) => (each.reachedWith ?? 0) > 0).length
  const values =
    exact === undefined || exact === null || Object.keys(exact.measures).length === 0
      ? simulation === undefined
        ? ''
        : ' Simulated, and compared with nothing:'
      : ' Its long-run values, exactly:'
  switch (recurrence) {
    case 'undetermined':
      return `It is open whether this model settles in a steady state.${values}`
    case 'mixed':
      return `The model settles in a steady state in part of the cases only.${values}`
    case 'positive recurrent':
      return reached > 1
        ? `The model settles in one of ${reached} closed classes, and chance decides in which.${values}`
        : `The model has a steady state.${values}`
    default:
      return format === 'stillmark/solve/1'
        ? `There is nothing to solve: the model has no steady state, it is ${recurrence}.`
        : `The model has no steady state: it is ${recurrence}.${values}`
  }
}

function comparisonSentence({ comparison, structure, exact }: StillmarkDocument): string {
  if (comparison === undefined) return ''
  const measures = Object.values(comparison.measures)
  const claims = Object.values(comparison.claims)
  const off = Object.entries(comparison.measures).filter(([, each]) => each.verdict === 'disagrees')
  const claimsOff = Object.entries(comparison.claims).filter(([, each]) => each.verdict === 'disagrees')
  const unsure = Object.entries(comparison.measures).filter(([, each]) => each.verdict === 'undecided')
  if (comparison.verdict === 'no steady state')
    return `There is no steady state: the model is ${structure?.recurrence}.`
  if (structure?.recurrence === 'null recurrent' || structure?.recurrence === 'transient')
    return `There is no steady state: the model is ${structure.recurrence}, but the simulation does not grow as it must.`
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
