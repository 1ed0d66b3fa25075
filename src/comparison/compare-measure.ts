import type { Estimate } from '../estimation/estimate.js'
import type { DistributionEstimate, QuantileEstimate } from '../estimation/quantile.js'
import { chiSquareTail, studentTail } from '../numbers/distributions.js'
import type { ExactMeasure } from '../stationary/exact-answer.js'
import type { MeasureComparison } from './verdict.js'

export type AnyEstimate = Estimate | QuantileEstimate | DistributionEstimate

export interface Tolerance {
  readonly kind: 'absolute' | 'relative'
  readonly value: number
}

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

/** Why a comparison came out as it did; findings are made from it. */
export type Reason =
  | 'inside'
  | 'harmless'
  | 'off'
  | 'too wide'
  | 'no interval'
  | 'bias left'
  | 'interval too narrow'
  | 'slow'
  | 'same'

export interface JudgedMeasure extends MeasureComparison {
  readonly reason: Reason
  readonly exact: number
  readonly estimate: number
  /** At the confidence that is adjusted for the number of measures; undefined where there is none. */
  readonly adjustedHalfWidth?: number
}

/** A half-width below this part of the predicted one is not to be believed, if chance does not make it so. */
const narrow = 0.6
const narrowByChance = 1e-3
/** Values that differ by less are the same number, rounded differently. */
const rounding = 1e-12

/**
 * Two things are weighed apart: whether the difference is visible (the adjusted interval leaves the exact value out) and
 * whether it matters (the tolerance). Agreement needs the whole interval inside the tolerance, never a mere failure to
 * see a difference; disagreement needs a difference that is visible and larger than the tolerance.
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
  const allowed = toleranceOf(exact.value, tolerance)
  const difference = adjusted.estimate - exact.value
  const base = {
    difference,
    tolerance: allowed,
    exact: exact.value,
    estimate: adjusted.estimate,
    pValue: pValueOf(exact.value, adjusted),
  }
  const size = Math.abs(difference)
  if (size <= rounding * Math.abs(exact.value) + exact.errorBound && (adjusted.halfWidth ?? 0) === 0) {
    return { ...base, verdict: 'agrees', reason: 'same', pValue: 1, adjustedHalfWidth: adjusted.halfWidth }
  }
  const { halfWidth } = adjusted
  if (halfWidth === undefined) return { ...base, verdict: 'undecided', reason: 'no interval' }
  const judged = { ...base, adjustedHalfWidth: halfWidth }
  if (prediction !== undefined && isTooNarrow(adjusted, prediction)) {
    return { ...judged, verdict: 'undecided', reason: 'interval too narrow' }
  }
  const [low, high] = sides(adjusted, halfWidth)
  const visible = exact.value + exact.errorBound < low || exact.value - exact.errorBound > high
  const inside = low >= exact.value - allowed && high <= exact.value + allowed
  if (inside) return { ...judged, verdict: 'agrees', reason: visible ? 'harmless' : 'inside' }
  if (!visible || size <= allowed) return { ...judged, verdict: 'undecided', reason: 'too wide' }
  const bias = prediction?.bias
  if (bias !== undefined && Math.abs(difference - bias) <= halfWidth && Math.abs(bias) > allowed / 4) {
    return { ...judged, verdict: 'undecided', reason: 'bias left' }
  }
  if (prediction?.slow) return { ...judged, verdict: 'undecided', reason: 'slow' }
  return { ...judged, verdict: 'disagrees', reason: 'off' }
}

/** The difference that matters, in the measure's unit. Of an exact 0 no percentage is left: then only 0 agrees. */
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

/**
 * All values at once: every share's interval (adjusted once more for the number of values) must lie within the tolerance
 * of the exact share. A relative tolerance is taken as a share of the whole: 2 % allows each share to be off by 0.02.
 */
function judgeDistribution(
  exact: ExactMeasure,
  estimate: DistributionEstimate,
  { value: allowed }: Tolerance,
): JudgedMeasure {
  const points = 'points' in exact ? exact.points : []
  const shares = new Map(points)
  const seen = new Map(Array.from(estimate.values, (value, i) => [value, estimate.points[i]]))
  const values = [...new Set([...shares.keys(), ...seen.keys()])]
  let worst = { gap: 0, share: 0, estimate: 0, halfWidth: 0 }
  let reach = 0
  let off = false
  let smallest = 1
  for (const value of values) {
    const share = shares.get(value) ?? 0
    const point = seen.get(value)
    const found = point?.estimate ?? 0
    const halfWidth = point?.halfWidth ?? 0
    const gap = found - share
    if (Math.abs(gap) > Math.abs(worst.gap)) worst = { gap, share, estimate: found, halfWidth }
    reach = Math.max(reach, Math.abs(gap) + halfWidth)
    if (point?.standardError === undefined || point.degreesOfFreedom === undefined) continue
    if (Math.abs(gap) > halfWidth + rounding && Math.abs(gap) > allowed) off = true
    if (point.standardError > 0) {
      smallest = Math.min(
        smallest,
        2 * studentTail(Math.abs(gap) / point.standardError, point.degreesOfFreedom) * values.length,
      )
    }
  }
  const base = {
    difference: worst.gap,
    tolerance: allowed,
    exact: worst.share,
    estimate: worst.estimate,
    adjustedHalfWidth: worst.halfWidth,
    pValue: Math.min(1, smallest),
  }
  if (off) return { ...base, verdict: 'disagrees', reason: 'off' }
  if (reach <= allowed) return { ...base, verdict: 'agrees', reason: 'inside' }
  return { ...base, verdict: 'undecided', reason: 'too wide' }
}
