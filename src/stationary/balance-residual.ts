import { productError, sumError } from '../numbers/double-double.js'
import type { ClosedChain } from './closed-chain.js'

/** How far the balance equations are missed: what flows into each state less what flows out. */
export interface BalanceResidual {
  /** Σ_j π_j q_ji - π_i Σ_j q_ij, length n, to doubled precision, then rounded. */
  readonly residual: Float64Array
  /** Bound on the error of each residual as evaluated, from doubled precision and from its rounding. */
  readonly evaluationError: Float64Array
  /** Bound on what the errors of the rates as given add to each residual. */
  readonly inputError: Float64Array
  /** max |residual| / flow out, over the states whose share is at least `smallestJudged`. */
  readonly worstRelative: number
}

/** Shares below this part of the whole have no digits to lose: products of them underflow. */
export const smallestJudged = 1e-140

/** Sums in doubled precision: relative error of each addition at most 2⁻¹⁰⁴, so this covers 2²⁰ of them. */
const doubledPrecision = 2 ** -84

/** @param share length n, of the chain's states */
export function balanceResidual(chain: ClosedChain, share: Float64Array): BalanceResidual {
  const { size: n, rowStart, target, rate, rateError } = chain
  const high = new Float64Array(n)
  const low = new Float64Array(n)
  const through = new Float64Array(n) // Σ of all that was added, without signs
  const outflow = new Float64Array(n)
  const inputError = new Float64Array(n)
  for (let i = 0; i < n; i++) {
    const held = share[i]
    let out = 0
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      const j = target[arc]
      const flow = held * rate[arc]
      const lost = productError(held, rate[arc], flow)
      const into = high[j] + flow
      low[j] += sumError(high[j], flow, into) + lost
      high[j] = into
      const outOf = high[i] - flow
      low[i] += sumError(high[i], -flow, outOf) - lost
      high[i] = outOf
      through[j] += flow
      out += flow
      const error = held * rateError[arc]
      inputError[i] += error
      inputError[j] += error
    }
    through[i] += out
    outflow[i] = out
  }
  const residual = new Float64Array(n)
  const evaluationError = new Float64Array(n)
  let worstRelative = 0
  for (let i = 0; i < n; i++) {
    residual[i] = high[i] + low[i]
    evaluationError[i] = doubledPrecision * through[i] + 2 ** -53 * Math.abs(residual[i])
    if (share[i] >= smallestJudged && outflow[i] > 0) {
      const relative = Math.abs(residual[i]) / outflow[i]
      if (!(relative <= worstRelative)) worstRelative = relative
    }
  }
  return { residual, evaluationError, inputError, worstRelative }
}
