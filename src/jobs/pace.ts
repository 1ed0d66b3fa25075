import type { PilotSeries } from '../simulation/pilot.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import type { Ground } from './ground.js'

/** Firings that are reckoned for the mean time until a closed class is entered, at least. */
const paceOfSettling = 10

/**
 * Firings per time unit in the long run: how long a run must be for something to happen. Where the model ends in a state
 * that nothing leads out of, its pace is that of getting there.
 */
export function eventsPerTimeUnit(
  { model, finite }: Ground,
  exact: ExactAnswer | undefined,
  pilot: PilotSeries | undefined,
): number {
  if (model.time === 'discrete') return 1
  if (finite !== undefined && exact?.shares !== undefined) {
    const { rowStart, rate, size } = finite.chain
    let total = 0
    for (let i = 0; i < size; i++)
      for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) total += exact.shares[i] * rate[arc]
    const { meanTimeToSettle } = finite.structure
    return Math.max(total, meanTimeToSettle > 0 ? paceOfSettling / meanTimeToSettle : 0) || 1
  }
  return pilot === undefined ? 1 : pilot.events / (pilot.settings.replications * pilot.settings.length)
}
