import { productError, sumError } from '../numbers/double-double.js'
import type { ClosedChain } from './closed-chain.js'

/** A generator applied to a function of the state, with bounds. */
export interface GeneratorImage {
  /** Σ_j q_ij (h_j - h_i), length n, to doubled precision, then rounded. */
  readonly image: Float64Array
  /** Bound on the error of each, from doubled precision and rounding. */
  readonly evaluationError: Float64Array
  /** Σ_j (error of q_ij) |h_j - h_i|: what the errors of the rates as given can change. */
  readonly inputError: Float64Array
}

/** As in the balance residual. */
const doubledPrecision = 2 ** -84

export function generatorImage(chain: ClosedChain, h: Float64Array): GeneratorImage {
  const { size: n, rowStart, target, rate, rateError } = chain
  const image = new Float64Array(n)
  const evaluationError = new Float64Array(n)
  const inputError = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    let high = 0
    let low = 0
    let through = 0
    let input = 0
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      const step = h[target[arc]] - h[i]
      const stepLost = sumError(h[target[arc]], -h[i], step)
      const term = rate[arc] * step
      const next = high + term
      low += sumError(high, term, next) + productError(rate[arc], step, term) + rate[arc] * stepLost
      high = next
      through += Math.abs(term)
      input += rateError[arc] * Math.abs(step)
    }
    image[i] = high + low
    evaluationError[i] = doubledPrecision * through + 2 ** -53 * Math.abs(image[i])
    inputError[i] = input * (1 + 2 ** -30)
  }
  return { image, evaluationError, inputError }
}
