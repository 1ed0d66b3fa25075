import { studentTail } from '../numbers/distributions.js'
import { atConfidence, checked, correlatedBatches, estimateMean } from './batch-means.js'
import type { Estimate } from './estimate.js'

/** Share of time at each value, as the simulation gives it. */
export interface Histogram {
  /** Ascending, length V. */
  readonly values: Float64Array
  /** (R × B) × V, row-major. */
  readonly shares: Float64Array
  readonly batches: number
}

export interface QuantileEstimate extends Estimate {
  /** The interval, whose two sides may differ in width; halfWidth is the larger one. */
  readonly low?: number
  readonly high?: number
  /** Probability of an estimate so far off where the long-run quantile is v. */
  readonly pValueOf: (value: number) => number
}

/**
 * The smallest value v with share(expression <= v) >= level, with an interval by turning round the interval of that
 * share: v is held possible while the interval of share(<= v) reaches up to the level and that of share(< v) down to it.
 * Values beyond the largest one seen are not considered: a level should leave room for many visits above it.
 *
 * @param level in (0, 1)
 * @throws not-finite, too-few
 */
export function estimateQuantile(
  histogram: Histogram,
  replications: number,
  level: number,
  confidence: number,
): QuantileEstimate {
  const { values } = histogram
  if (!(level > 0 && level < 1)) throw new RangeError(`a level of ${level}`)
  checked(histogram.shares, replications, confidence)
  const shares = cumulativeEstimates(histogram, replications, confidence)
  // Sums of shares reach 1 only within rounding.
  const reaches = (share: number) => share >= level - 1e-12
  const found = shares.findIndex(({ estimate }) => reaches(estimate))
  const at = found < 0 ? values.length - 1 : found
  const lowest = shares.findIndex(({ estimate, halfWidth }) => reaches(estimate + (halfWidth ?? 0)))
  const highest = shares.findIndex(({ estimate, halfWidth }) => reaches(estimate - (halfWidth ?? 0)))
  const low = values[lowest < 0 ? at : lowest]
  const high = values[highest < 0 ? values.length - 1 : highest]
  const estimate = values[at]
  const pValueOf = (value: number): number => {
    // Below the value there must be less than the level, up to it at least the level.
    const upTo = values.findLastIndex((each) => each <= value)
    const below = values[upTo] === value ? upTo - 1 : upTo
    const short = upTo < 0 ? 0 : onOneSide(shares[upTo], level, 1)
    const over = below < 0 ? 1 : onOneSide(shares[below], level, -1)
    return Math.min(1, 2 * Math.min(short, over))
  }
  const deciding = shares[at]
  const base = {
    estimate,
    confidence,
    method: `turned interval of the share, ${deciding.method}`,
    batches: deciding.batches,
    ...(deciding.batchTest === undefined ? {} : { batchTest: deciding.batchTest }),
    low,
    high,
    pValueOf,
  }
  if (shares.slice(0, at + 1).some(({ noInterval }) => noInterval === correlatedBatches)) {
    return { ...base, noInterval: correlatedBatches }
  }
  if (deciding.batches === 1) return { ...base, noInterval: deciding.noInterval }
  return { ...base, halfWidth: Math.max(estimate - low, high - estimate) }
}

/**
 * P-value of "the share is the level" against a share that is too low (side 1) or too high (side -1). Where all n batches
 * show nothing else, chance does that with probability levelⁿ at most (or (1 - level)ⁿ), however slow each one is.
 */
function onOneSide(share: Estimate, level: number, side: 1 | -1): number {
  const gap = (level - share.estimate) * side
  if (gap <= 1e-12) return 1
  const { standardError, degreesOfFreedom, batches, noInterval } = share
  if (standardError !== undefined && degreesOfFreedom !== undefined) {
    return standardError === 0 ? 0 : studentTail(gap / standardError, degreesOfFreedom)
  }
  return noInterval === correlatedBatches ? 1 : (side === 1 ? 1 - level : level) ** (batches ?? 0)
}

function cumulativeEstimates(
  { values, shares, batches }: Histogram,
  replications: number,
  confidence: number,
): Estimate[] {
  const rows = replications * batches
  const count = values.length
  const column = new Float64Array(rows)
  const estimates: Estimate[] = []
  for (let v = 0; v < count; v++) {
    for (let row = 0; row < rows; row++) column[row] += shares[row * count + v]
    estimates.push(estimateMean(column, replications, confidence))
  }
  return estimates
}

/** Share of time at each value with its half-width. */
export interface DistributionEstimate {
  readonly confidence: number
  readonly method: string
  readonly values: Float64Array
  readonly points: readonly Estimate[]
}

export function estimateDistribution(
  { values, shares, batches }: Histogram,
  replications: number,
  confidence: number,
): DistributionEstimate {
  const rows = replications * batches
  const count = values.length
  const points = Array.from(values, (_, v) => {
    const column = new Float64Array(rows)
    for (let row = 0; row < rows; row++) column[row] = shares[row * count + v]
    return estimateMean(column, replications, confidence)
  })
  return { confidence, method: `${points[0]?.method ?? 'nothing seen'}, each value on its own`, values, points }
}

export const distributionAtConfidence = (estimate: DistributionEstimate, confidence: number): DistributionEstimate => ({
  ...estimate,
  confidence,
  points: estimate.points.map((point) => atConfidence(point, confidence)),
})
