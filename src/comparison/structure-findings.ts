import { inUnits, shown } from './shown-number.js'
import type { Finding } from './verdict.js'

/** What findings need to know of a chain's structure. */
export interface StructureFacts {
  readonly classes: readonly {
    readonly size: number
    readonly period: number
    readonly reachedWith: number
    /** One of its states as people read it. */
    readonly example: unknown
    /** Long-run value of each measure in this class alone, where it has one. */
    readonly measures: Readonly<Record<string, number>>
  }[]
  readonly transientStates: number
  readonly meanTimeToSettle: number
}

const inWords = (state: unknown): string =>
  typeof state === 'string'
    ? `"${state}"`
    : Object.entries(state as Record<string, number | readonly number[]>)
        .map(([name, value]) => `${name} ${Array.isArray(value) ? value.join(' ') : value}`)
        .join(', ')

/** What a simulator will see of a chain that is not simply irreducible and aperiodic, and why. */
export function structureFindings(facts: StructureFacts, unit: string): Finding[] {
  const findings: Finding[] = []
  const reached = facts.classes.filter((each) => each.reachedWith > 0)
  if (reached.length > 1) findings.push(startDependent(reached, facts, unit))
  else if (reached.length === 1 && reached[0].size === 1 && facts.transientStates > 0 && facts.meanTimeToSettle > 0) {
    findings.push({
      code: 'absorbing',
      says: `The run ends in one state for good: ${inWords(reached[0].example)}.`,
      evidence: `It is entered after ${inUnits(facts.meanTimeToSettle, unit)} on average, and nothing leads out of it. Every long-run value is that of this state.`,
      next: 'If the plant goes on after that, add the transition that leads out; if the time until then is asked for, long-run averages do not answer it.',
      states: [reached[0].example],
    })
  }
  for (const each of reached) {
    if (each.period < 2) continue
    findings.push({
      code: 'periodic',
      says: `The model goes round with period ${each.period}.`,
      evidence: `Each state can be met only every ${each.period} steps, so the distribution over the states never settles; averages over time do, and they are what is compared here.`,
      next: `Do not sample every ${each.period} steps (or a multiple), and do not read a single late step as the steady state.`,
    })
  }
  return findings
}

function startDependent(reached: StructureFacts['classes'], facts: StructureFacts, unit: string): Finding {
  const shownClasses = reached.slice(0, 4)
  const parts = shownClasses.map((each) => {
    const values = Object.entries(each.measures)
      .slice(0, 3)
      .map(([name, value]) => `${name} ${shown(value)}`)
      .join(', ')
    return `with probability ${shown(each.reachedWith)} in ${each.size === 1 ? 'the state' : `${each.size.toLocaleString('en-US')} states around`} ${inWords(each.example)}${values === '' ? '' : ` (${values})`}`
  })
  const settle =
    facts.meanTimeToSettle > 0 ? ` It is settled after ${inUnits(facts.meanTimeToSettle, unit)} on average.` : ''
  return {
    code: 'start-dependent',
    says: `The run ends in one of ${reached.length} parts of the model and never leaves it, so one long run shows one of them only.`,
    evidence: `It ends ${parts.join('; ')}${reached.length > 4 ? `; and ${reached.length - 4} more` : ''}.${settle} The exact values are the mixture.`,
    next: 'Compare within one part, by starting there; or run many replications: for the mixture only their number counts, not their length.',
    states: shownClasses.map((each) => each.example),
  }
}
