import type { Classification } from '../recurrence/classification.js'
import { shown } from './shown-number.js'
import type { Finding } from './verdict.js'

/** What is to be said of a model that has no steady state, or whose class is open: the cause comes first. */
export function divergenceFindings(countable: Classification): Finding[] {
  const { recurrence, grade, basis, explosive, remedies } = countable
  const remedy = remedies[0]
  const steady =
    remedy === undefined
      ? ''
      : remedy.threshold === remedy.now
        ? `It is steady as soon as ${remedy.constant} is ${remedy.steadyWhen} ${shown(remedy.threshold, 6)}, which it is exactly now. `
        : `It is steady while ${remedy.constant} stays ${remedy.steadyWhen} ${shown(remedy.threshold, 6)}; it is ${shown(remedy.now, 6)}. `
  const evidence = `${grade === 'proved' ? 'Proved' : 'Indicated, not proved'}: ${basis}.`
  const constant = remedy === undefined ? {} : { constant: remedy.constant }
  if (explosive === true) {
    return [
      {
        code: 'explosive',
        says: 'The model makes infinitely many events in finite time.',
        evidence,
        next: `Bound the rates: no plant does this. ${steady}`.trim(),
        ...constant,
      },
    ]
  }
  if (recurrence === 'null recurrent') {
    return [
      {
        code: 'balanced-drift',
        says: 'The model is exactly balanced: it comes back for sure, but the mean time until it does is infinite.',
        evidence: `${evidence} Averages over time go on growing, and a longer warm-up can't help: there is nothing to settle to.`,
        next: `${steady}Ask for the time until a given backlog is passed instead of a long-run average.`,
        ...constant,
      },
    ]
  }
  if (recurrence === 'transient') {
    const oneWay = /only grow|never falls|one-way/.test(`${basis} ${countable.checked.join(' ')}`)
    return [
      {
        code: oneWay ? 'one-way' : 'outward-drift',
        says: oneWay
          ? 'The model counts one way only: no state is met again, so it has no long-run average.'
          : 'The model runs away: more comes in than can go out.',
        evidence,
        next: `${steady}${oneWay ? 'Measure its rate of growth (a frequency), or take the counter out of the state.' : 'Simulated averages measure the length of the run, nothing else.'}`,
        ...constant,
      },
    ]
  }
  return []
}
