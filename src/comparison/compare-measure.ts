import type { Estimate } from '../estimation/estimate.js'
import type { DistributionEstimate, QuantileEstimate } from '../estimation/quantile.js'
import { chiSquareTail, studentTail } from '../numbers/distributions.js'
import type { ExactMeasure } from '../stationary/exact-answer.js'
import { judgeDistribution } from './compare-distribution.js'
import { type JudgedMeasure, rounding, type Tolerance } from './judged-measure.js'

export type { Tolerance } from './judged-measure.js'

export type AnyEstimate = Estimate | QuantileEstimate | DistributionEstimate

/** What theory says of this run on this measure; where the exact solution gives it. */
export interface Prediction {
  /** At the estimate's own confidence. */
  readonly halfWidth: number
  /** Bias of the mean that the warm-up leaves; undefined where it is not known. */
  readonly bias?: number
  /** Integrated correlation time, in time units: observations nearer than it hang together. */
  readonly correlationTime: number
  /** A replication lasts too few correlation times for its average to be more than a draw of the slow part. */
  readonly slow: boolean
}

/** Correlation times that a replication should last: with fewer, its average is one draw of the slow part. */
export const fewestCorrelationTimes = 20

/** A half-width below this part of the predicted one is not to be believed, if chance does not make it so. */
const narrow = 0.6
const narrowByChance = 1e-3

/**
 * Two things are weighed apart: whether the difference is visible (the adjusted interval leaves the exact value out) and
 * whether it matters (the tolerance). Agreement needs the whole interval inside the tolerance, never a mere failure to
 * see a difference; disagreement needs a difference that is larger than the tolerance, and visible both by the run's own
 * spread and, where it is known, by the exact one: a right simulation has that, so a spread that came out small by luck
 * does not condemn it.
 *
 * @param adjusted the estimate at the confidence that is adjusted for the number of measures judged
 */
export function judgeMeasure(
  exact: ExactMeasure,
  adjusted: AnyEstimate,
  tolerance: Tolerance,
  prediction: Prediction | undefined,
): JudgedMeasure {
  if ('points' in adjusted) return judgeDistribution(exact, adjusted, tolerance)
  if (!('value' in exact)) throw new Error('a distribution is compared with a distribution')
  const { value, errorBound } = exact
  const allowed = toleranceOf(value, tolerance)
  const difference = adjusted.estimate - value
  const { halfWidth } = adjusted
  const judged = {
    difference,
    tolerance: allowed,
    exact: value,
    estimate: adjusted.estimate,
    pValue: pValueOf(value, adjusted),
    ...(halfWidth === undefined ? {} : { adjustedHalfWidth: halfWidth }),
  }
  const size = Math.abs(difference)
  const sameNumber = rounding * Math.abs(value) + errorBound
  if (size <= sameNumber && (halfWidth ?? 0) === 0) return { ...judged, verdict: 'agrees', reason: 'same', pValue: 1 }
  if (halfWidth === undefined) return { ...judged, verdict: 'undecided', reason: 'no interval' }
  const [low, high] = sides(adjusted, halfWidth)
  const visible = value + errorBound < low || value - errorBound > high
  // Of a value that may be 0 a percentage says nothing; that it is visibly not 0 can still be said.
  if (!visible && tolerance.kind === 'relative' && Math.abs(value) <= errorBound) {
    return { ...judged, verdict: 'undecided', reason: 'no percentage' }
  }
  const predicted = prediction?.halfWidth ?? 0
  if (prediction !== undefined && size + predicted > allowed && isTooNarrow(adjusted, prediction)) {
    return { ...judged, verdict: 'undecided', reason: 'interval too narrow' }
  }
  const bias = prediction?.bias
  const explained = bias !== undefined && Math.abs(difference - bias) <= halfWidth + sameNumber
  const inside = low >= value - allowed && high <= value + allowed
  // Where all replications give the very same value, what is left of a difference comes of where the run ends.
  const noticed = visible && adjusted.standardError !== 0
  if (inside) return { ...judged, verdict: 'agrees', reason: noticed && !explained ? 'harmless' : 'inside' }
  if (!visible || size <= allowed || size <= predicted) return { ...judged, verdict: 'undecided', reason: 'too wide' }
  if (explained && Math.abs(bias) > allowed / 4) return { ...judged, verdict: 'undecided', reason: 'bias left' }
  if (prediction?.slow) return { ...judged, verdict: 'undecided', reason: 'slow' }
  return { ...judged, verdict: 'disagrees', reason: 'off' }
}

/** The difference that matters, in the measure's unit. Of an exact 0 no percentage is left. */
export const toleranceOf = (exact: number, { kind, value }: Tolerance): number =>
  kind === 'absolute' ? value : value * Math.abs(exact)

function sides(estimate: Estimate | QuantileEstimate, halfWidth: number): readonly [number, number] {
  if ('low' in estimate && estimate.low !== undefined && estimate.high !== undefined)
    return [estimate.low, estimate.high]
  return [estimate.estimate - halfWidth, estimate.estimate + halfWidth]
}

function pValueOf(exact: number, estimate: Estimate | QuantileEstimate): number {
  if ('pValueOf' in estimate) return estimate.pValueOf(exact)
  const { standardError, degreesOfFreedom } = estimate
  const size = Math.abs(estimate.estimate - exact)
  if (standardError === undefined || degreesOfFreedom === undefined) return 1
  if (standardError === 0) return size <= rounding * Math.abs(exact) ? 1 : 0
  return Math.min(1, 2 * studentTail(size / standardError, degreesOfFreedom))
}

/** Whether the spread found is below its exact value by more than chance makes likely. */
function isTooNarrow(estimate: Estimate, prediction: Prediction): boolean {
  const { standardError, degreesOfFreedom } = estimate
  if (standardError === undefined || degreesOfFreedom === undefined || !(prediction.halfWidth > 0)) return false
  const ratio = (estimate.halfWidth ?? 0) / prediction.halfWidth
  if (ratio >= narrow) return false
  return 1 - chiSquareTail(degreesOfFreedom * ratio * ratio, degreesOfFreedom) < narrowByChance
}
