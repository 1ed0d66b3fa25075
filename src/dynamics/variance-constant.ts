import type { Chain } from '../chain/chain.js'

/**
 * Limit of T · Var(time average over T) of a functional, from its relative values.
 *
 * The sum of squared jumps of the martingale that the Poisson equation makes of the functional (Glynn and Meyn 1996,
 * from memory): no term is negative, so nothing cancels, whatever the chain.
 *
 * @param shares long-run shares of time π, length n
 * @param relativeValues g with (I - P) g = f - πf in discrete time, -Q g = f - πf in continuous time, length n; any
 *   constant may be added
 * @param weights what a firing counts, by labelled arc (length of `chain.target`); undefined for a time average
 * @returns in (unit of the functional)² × time; meaningful for one closed class
 */
export function varianceConstant(
  chain: Chain,
  shares: Float64Array,
  relativeValues: Float64Array,
  weights?: Float64Array,
): number {
  const { rowStart, target, rate, size } = chain
  const discrete = chain.time === 'discrete'
  let total = 0
  for (let i = 0; i < size; i++) {
    const share = shares[i]
    if (share === 0) continue
    const here = relativeValues[i]
    let row = 0
    // In discrete time the mean move is taken off; in continuous time it goes with dt and leaves no trace.
    let mean = 0
    if (discrete) {
      for (let k = rowStart[i]; k < rowStart[i + 1]; k++) {
        mean += rate[k] * (relativeValues[target[k]] - here + (weights === undefined ? 0 : weights[k]))
      }
    }
    for (let k = rowStart[i]; k < rowStart[i + 1]; k++) {
      const jump = relativeValues[target[k]] - here + (weights === undefined ? 0 : weights[k]) - mean
      row += rate[k] * jump * jump
    }
    total += share * row
  }
  return total
}
