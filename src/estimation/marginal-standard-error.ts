import { studentTail } from '../numbers/distributions.js'

/** Where a series is cut, and whether that is to be believed. */
export interface WarmUpCut {
  /** Observations to delete from the front of the series. */
  readonly cut: number
  /** False: the cut is not to be believed, `why` says what is the matter. */
  readonly settled: boolean
  readonly why: string
}

/** Observations that are averaged into one before the rule is applied (MSER-5: White, Cobb and Spratt 2000). */
export const mserBatch = 5

/** Batches of five that the rule needs to say anything. */
const fewest = 10

/**
 * Truncation by marginal standard error: the cut that makes the standard error of what is left, taken as if it were
 * independent, smallest: min over d of Σ_{i>=d}(x_i - mean_d)² / (n - d)². Linear in the data.
 *
 * Source: White 1997; with batches of five (MSER-5) White, Cobb and Spratt 2000 (both from memory). A minimum in the
 * second half of the data says that the series has not settled within it: then the rule refuses.
 *
 * @param series one series, or the mean over replications; equally spaced
 * @param batch observations averaged into one first; 1 for plain MSER
 */
export function marginalStandardErrorCut(series: Float64Array, batch = mserBatch): WarmUpCut {
  const n = Math.floor(series.length / batch)
  if (n < fewest) {
    return { cut: 0, settled: false, why: `${series.length} observations are too few for the rule` }
  }
  const means = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    let sum = 0
    for (let k = 0; k < batch; k++) sum += series[i * batch + k]
    means[i] = sum / batch
  }
  const { best, constant } = minimizer(means)
  const cut = best * batch
  if (constant) return { cut: 0, settled: true, why: 'the series does not vary' }
  if (best > n / 2) {
    return { cut, settled: false, why: 'its best cut lies in the second half of the series, which has not settled' }
  }
  return { cut, settled: true, why: `MSER-${batch} deletes ${cut} of ${series.length} observations` }
}

/** Index of the least criterion, the first of equals, and whether the series varies at all. */
function minimizer(means: Float64Array): { readonly best: number; readonly constant: boolean } {
  const n = means.length
  const criterion = marginalStandardErrors(means)
  // The last few leave too little to judge: the criterion falls to 0 there of itself.
  const last = n - Math.min(5, Math.floor(n / 4))
  let best = last
  for (let d = last - 1; d >= 0; d--) if (criterion[d] <= criterion[best]) best = d
  return { best, constant: criterion[0] === 0 }
}

/**
 * Σ_{i>=d}(x_i - mean_d)² / (n - d)² for every d from 0 to n - 1, from the back with a running mean and sum of squares
 * (Welford 1962). The last one is 0.
 */
export function marginalStandardErrors(means: Float64Array): Float64Array {
  const n = means.length
  const criterion = new Float64Array(n)
  const shift = means[n - 1] // taken off first: a large mean costs the squares their digits
  let mean = 0
  let squares = 0
  for (let d = n - 1; d >= 0; d--) {
    const left = n - d
    const value = means[d] - shift
    const step = value - mean
    mean += step / left
    squares += step * (value - mean)
    criterion[d] = squares / left ** 2
  }
  return criterion
}

/**
 * The rule on replications averaged point by point, with a check that the series does not go on growing: a straight line
 * through what is left after the cut, tested over the replications' own slopes.
 *
 * @param series R × points, row-major
 */
export function warmUpCut(series: Float64Array, replications: number): WarmUpCut {
  const points = series.length / replications
  const average = new Float64Array(points)
  for (let r = 0; r < replications; r++) {
    for (let i = 0; i < points; i++) average[i] += series[r * points + i] / replications
  }
  if (!average.every(Number.isFinite)) {
    return { cut: 0, settled: false, why: 'the series has no finite mean' }
  }
  const found = marginalStandardErrorCut(average)
  if (!found.settled || replications < 4) return found
  if (growsOn(series, average, replications, found.cut))
    return { ...found, settled: false, why: 'the series still rises or falls after its best cut' }
  return found
}

/** A slope that chance makes so seldom (two-sided) is held for growth. Strict, since the rule is tried on many series. */
const growthByChance = 5e-4

/**
 * Whether what is left after the cut rises or falls: the replications' own slopes have a common sign beyond chance, and
 * the line climbs by more than the averaged points scatter (a deterministic cycle cut off within a round has some slope).
 */
function growsOn(series: Float64Array, average: Float64Array, replications: number, cut: number): boolean {
  const points = average.length
  const n = points - cut
  const middle = (n - 1) / 2
  const squares = (n * (n * n - 1)) / 12
  const slopes = Array.from({ length: replications }, (_, r) => {
    let slope = 0
    for (let i = 0; i < n; i++) slope += (i - middle) * series[r * points + cut + i]
    return slope / squares
  })
  const mean = slopes.reduce((a, b) => a + b, 0) / replications
  const level = average.subarray(cut).reduce((a, b) => a + b, 0) / n
  const scatter = average.subarray(cut).reduce((sum, x) => sum + (x - level) ** 2, 0) / n
  if (!((mean * n) ** 2 > scatter)) return false
  const variance = slopes.reduce((sum, slope) => sum + (slope - mean) ** 2, 0) / (replications - 1)
  return 2 * studentTail(Math.abs(mean) / Math.sqrt(variance / replications), replications - 1) < growthByChance
}
