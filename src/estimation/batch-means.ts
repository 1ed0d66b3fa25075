import { StillmarkError } from '../errors/stillmark-error.js'
import { studentTailQuantile } from '../numbers/distributions.js'
import type { Estimate } from './estimate.js'
import { joinBatches, meansOf } from './joined-batches.js'

/**
 * Interval for a long-run mean from replications that are cut into batches.
 *
 * Replications are independent of one another, and from ten on each counts as a whole. Where they are fewer, adjacent
 * batches within each are joined until von Neumann's test no longer sees them hang together, and then several times once
 * more (see `joinBatches`); if that leaves one, whole replications count. The interval is Student's on what is left.
 * It leaves out the bias of the start (the warm-up's part) and skewness, which costs coverage where runs are short.
 * Source: Schmeiser 1982; Law and Carson 1979 (both from memory).
 *
 * @param batchMeans R × B, row-major, equally long, warm-up already deleted; own unit
 * @param replications R
 * @param confidence in (0, 1)
 * @returns estimate and halfWidth in the unit of the observations. Without a half-width, and with the reason, where
 *   one replication's batches are correlated or fewer than two, or where every batch shows the very same 0 or 1: then
 *   nothing is known of what was not seen
 * @throws not-finite, too-few
 */
export function estimateMean(batchMeans: Float64Array, replications: number, confidence: number): Estimate {
  const batches = checked(batchMeans, replications, confidence)
  const joined = joinBatches(batchMeans, replications, batches)
  const means = meansOf(batchMeans, replications, batches, joined.batches)
  const { estimate, standardError } = meanOf(means)
  const base = {
    estimate,
    confidence,
    method: methodOf(replications, joined.batches),
    batches: means.length,
    ...(joined.test === undefined ? {} : { batchTest: joined.test }),
  }
  const noInterval = reasonAgainst(means, joined.correlated)
  if (noInterval !== undefined) return { ...base, noInterval }
  const degreesOfFreedom = means.length - 1
  return {
    ...base,
    halfWidth: halfWidthOf(standardError, degreesOfFreedom, confidence),
    standardError,
    degreesOfFreedom,
  }
}

/** Half-width of Student's interval. */
export const halfWidthOf = (standardError: number, degreesOfFreedom: number, confidence: number): number =>
  standardError === 0 ? 0 : studentTailQuantile((1 - confidence) / 2, degreesOfFreedom) * standardError

/** The same estimate at another confidence: for verdicts that judge several measures. */
export function atConfidence(estimate: Estimate, confidence: number): Estimate {
  const { standardError, degreesOfFreedom } = estimate
  if (standardError === undefined || degreesOfFreedom === undefined) return { ...estimate, confidence }
  return { ...estimate, confidence, halfWidth: halfWidthOf(standardError, degreesOfFreedom, confidence) }
}

/** @returns B */
export function checked(observations: Float64Array, replications: number, confidence: number): number {
  if (!(confidence > 0 && confidence < 1)) throw new RangeError(`a confidence of ${confidence}`)
  const batches = observations.length / replications
  if (!Number.isInteger(batches) || batches < 1) {
    throw new StillmarkError({
      code: 'too-few',
      what: 'There are no observations to make an interval from.',
      next: 'Run longer.',
    })
  }
  for (const each of observations) {
    if (!Number.isFinite(each)) {
      throw new StillmarkError({
        code: 'not-finite',
        what: `An observation is ${each}, so there is no mean.`,
        next: 'Look for a division by 0 in the measure.',
      })
    }
  }
  return batches
}

export function meanOf(means: Float64Array): { readonly estimate: number; readonly standardError: number } {
  const n = means.length
  const shift = means[0] // taken off first, so that constant data have variance 0 and no digits are lost
  let sum = 0
  for (const x of means) sum += x - shift
  const offset = sum / n
  let squares = 0
  for (const x of means) squares += (x - shift - offset) ** 2
  return { estimate: shift + offset, standardError: n > 1 ? Math.sqrt(squares / (n - 1) / n) : Number.NaN }
}

export function methodOf(replications: number, batches: number): string {
  const runs = `${replications} ${replications === 1 ? 'replication' : 'replications'}`
  return batches === 1 ? `replication means, ${runs}` : `batch means, ${runs} × ${batches} batches`
}

export const correlatedBatches =
  'the batches of the one replication hang together: run longer, or with more replications'

export const neverSeen = 'it was never seen in the run'

/** Why no honest interval can be made from these means. */
export function reasonAgainst(means: Float64Array, correlated: boolean): string | undefined {
  if (correlated) return correlatedBatches
  if (means.length < 2) return 'one observation alone has no interval: run more replications'
  const [first] = means
  if ((first === 0 || first === 1) && means.every((x) => x === first)) {
    return first === 0 ? neverSeen : 'nothing else was ever seen in the run'
  }
  return undefined
}
