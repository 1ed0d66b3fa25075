import { checked, halfWidthOf, meanOf, methodOf, reasonAgainst } from './batch-means.js'
import type { Estimate } from './estimate.js'
import { joinBatches, meansOf } from './joined-batches.js'

/**
 * Interval for a ratio of two long-run means, by the jackknife over batches (Quenouille 1949; Miller 1974, both from
 * memory), which takes off the bias of order one over the number of batches.
 *
 * @param top R × B, row-major, like `bottom` from the same batches
 * @returns as `estimateMean`; without a half-width where the lower side may be 0
 */
export function estimateRatio(
  top: Float64Array,
  bottom: Float64Array,
  replications: number,
  confidence: number,
): Estimate {
  const batches = checked(top, replications, confidence)
  checked(bottom, replications, confidence)
  const overall = meanOf(bottom).estimate
  const ratio = meanOf(top).estimate / overall
  const none = { estimate: ratio, confidence, method: methodOf(replications, 1), batches: top.length }
  if (overall === 0) return { ...none, noInterval: 'what it divides by was never seen in the run' }
  // What hangs together from batch to batch is the ratio's own deviation, not either side alone.
  const deviation = top.map((x, i) => x - ratio * bottom[i])
  const joined = joinBatches(deviation, replications, batches)
  const over = meansOf(top, replications, batches, joined.batches)
  const under = meansOf(bottom, replications, batches, joined.batches)
  const n = over.length
  const base = {
    ...none,
    method: `jackknifed ${methodOf(replications, joined.batches)}`,
    batches: n,
    ...(joined.test === undefined ? {} : { batchTest: joined.test }),
  }
  const reason = reasonAgainst(over, joined.correlated)
  if (reason !== undefined) return { ...base, noInterval: reason }
  let sumOver = 0
  let sumUnder = 0
  for (let i = 0; i < n; i++) {
    sumOver += over[i]
    sumUnder += under[i]
  }
  const whole = sumOver / sumUnder
  const pseudo = over.map((x, i) => n * whole - (n - 1) * ((sumOver - x) / (sumUnder - under[i])))
  if (!pseudo.every(Number.isFinite)) return { ...base, noInterval: 'what it divides by was seen in one batch only' }
  const { estimate, standardError } = meanOf(pseudo)
  return {
    ...base,
    estimate,
    halfWidth: halfWidthOf(standardError, n - 1, confidence),
    standardError,
    degreesOfFreedom: n - 1,
  }
}
