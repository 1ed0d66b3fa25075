import type { DistributionEstimate } from '../estimation/quantile.js'
import { studentTail } from '../numbers/distributions.js'
import type { ExactMeasure } from '../stationary/exact-answer.js'
import { type JudgedMeasure, rounding, type Tolerance } from './judged-measure.js'

/** One value of a distribution: its exact share of time against the simulated one. */
interface JudgedPoint {
  readonly gap: number
  readonly share: number
  readonly estimate: number
  /** Undefined where the value was seen but no honest interval can be given. */
  readonly halfWidth: number | undefined
  readonly pValue: number
}

/**
 * All values at once: every share's interval (adjusted once more for the number of values) must lie within the tolerance
 * of the exact share. A relative tolerance is taken as a share of the whole: 2 % allows each share to be off by 0.02,
 * since a percentage of a rare value's share would ask for runs without end. A value that was never met counts as 0.
 */
export function judgeDistribution(
  exact: ExactMeasure,
  estimate: DistributionEstimate,
  { value: allowed }: Tolerance,
): JudgedMeasure {
  const points = pointsOf(exact, estimate)
  const level = 1 - estimate.confidence
  let worst: JudgedPoint = { gap: 0, share: 0, estimate: 0, halfWidth: 0, pValue: 1 }
  let widest = worst
  let smallest = 1
  let visible = false
  let off = false
  let unknown = false
  for (const point of points) {
    const size = Math.abs(point.gap)
    const same = size <= rounding + exact.errorBound
    if (size > Math.abs(worst.gap)) worst = point
    if (reachOf(point) > reachOf(widest)) widest = point
    smallest = Math.min(smallest, point.pValue)
    if (same) continue
    if (point.halfWidth === undefined) unknown = true
    if (point.pValue >= level) continue
    visible = true
    if (size > allowed) off = true
  }
  const { gap, share, estimate: found, halfWidth } = off || points.length === 0 ? worst : widest
  const judged = {
    difference: gap,
    tolerance: allowed,
    exact: share,
    estimate: found,
    ...(halfWidth === undefined ? {} : { adjustedHalfWidth: halfWidth }),
    pValue: Math.min(1, smallest * Math.max(1, points.length)),
  }
  if (off) return { ...judged, verdict: 'disagrees', reason: 'off' }
  if (unknown || points.length === 0) return { ...judged, verdict: 'undecided', reason: 'no interval' }
  if (reachOf(widest) > allowed) return { ...judged, verdict: 'undecided', reason: 'too wide' }
  return { ...judged, verdict: 'agrees', reason: visible ? 'harmless' : 'inside' }
}

const reachOf = ({ gap, halfWidth }: JudgedPoint): number => Math.abs(gap) + (halfWidth ?? 0)

function pointsOf(exact: ExactMeasure, estimate: DistributionEstimate): JudgedPoint[] {
  const shares = new Map('points' in exact ? exact.points : [])
  const seen = new Map(Array.from(estimate.values, (value, i) => [value, estimate.points[i]]))
  const replicates = Math.max(1, ...estimate.points.map(({ batches }) => batches ?? 1))
  return [...new Set([...shares.keys(), ...seen.keys()])].map((value) => {
    const share = shares.get(value) ?? 0
    const point = seen.get(value)
    if (point === undefined) {
      // A settled run misses a value for good with probability 1 - share at most, however slow it is; and so below.
      return { gap: -share, share, estimate: 0, halfWidth: 0, pValue: (1 - share) ** replicates }
    }
    const gap = point.estimate - share
    if (point.halfWidth === undefined && point.estimate === 1 && replicates > 1) {
      return { gap, share, estimate: 1, halfWidth: 0, pValue: share ** replicates }
    }
    return { gap, share, estimate: point.estimate, halfWidth: point.halfWidth, pValue: pValueOf(gap, point) }
  })
}

function pValueOf(gap: number, { standardError, degreesOfFreedom }: DistributionEstimate['points'][number]): number {
  if (standardError === undefined || degreesOfFreedom === undefined) return 1
  if (standardError === 0) return Math.abs(gap) <= rounding ? 1 : 0
  return 2 * studentTail(Math.abs(gap) / standardError, degreesOfFreedom)
}
