import type { Chain } from '../chain/chain.js'

/**
 * Distribution over the states at one time, by uniformization (Jensen 1953; truncation as in Fox and Glynn 1988,
 * both from memory); in discrete time by as many products with the transition matrix.
 *
 * All terms are non-negative, so the error of every entry stays near rounding: at most about (number of products) ε
 * relative, plus what is cut off the Poisson weights, less than 1e-17 in all.
 *
 * @param from distribution at time 0, length n. Not changed.
 * @param time in time units, at least 0; whole steps in discrete time
 * @returns distribution at `time`, length n
 * @cost `transientCost(chain, time)` multiplications
 */
export function transientDistribution(chain: Chain, from: Float64Array, time: number): Float64Array {
  if (chain.time === 'discrete') return afterSteps(chain, from, time)
  const speed = largestOutflow(chain)
  if (speed === 0 || time === 0) return from.slice()
  const { first, weights } = poissonWeights(speed * time)
  const sum = new Float64Array(chain.size)
  let now = from.slice()
  let next = new Float64Array(chain.size)
  const last = first + weights.length - 1
  for (let step = 0; ; step++) {
    if (step >= first) {
      const weight = weights[step - first]
      for (let i = 0; i < now.length; i++) sum[i] += weight * now[i]
    }
    if (step === last) return sum
    uniformizedStep(chain, speed, now, next)
    ;[now, next] = [next, now]
  }
}

/** Multiplications that `transientDistribution` takes. */
export function transientCost(chain: Chain, time: number): number {
  const arcs = chain.target.length + chain.size
  if (chain.time === 'discrete') return time * arcs
  const mean = largestOutflow(chain) * time
  return (mean + 10 * Math.sqrt(mean) + 40) * arcs
}

function afterSteps(chain: Chain, from: Float64Array, steps: number): Float64Array {
  const { rowStart, target, rate, size } = chain
  let now = from.slice()
  let next = new Float64Array(size)
  for (let step = 0; step < steps; step++) {
    next.fill(0)
    for (let i = 0; i < size; i++) {
      const mass = now[i]
      if (mass === 0) continue
      for (let k = rowStart[i]; k < rowStart[i + 1]; k++) next[target[k]] += mass * rate[k]
    }
    ;[now, next] = [next, now]
  }
  return now
}

/** One step of the chain that jumps at the common speed and mostly stays. */
function uniformizedStep(chain: Chain, speed: number, now: Float64Array, next: Float64Array): void {
  const { rowStart, target, rate, size } = chain
  next.fill(0)
  for (let i = 0; i < size; i++) {
    const mass = now[i]
    if (mass === 0) continue
    const portion = mass / speed
    let leaving = 0
    for (let k = rowStart[i]; k < rowStart[i + 1]; k++) {
      if (target[k] === i) continue
      leaving += rate[k]
      next[target[k]] += portion * rate[k]
    }
    next[i] += portion * (speed - leaving)
  }
}

/** Largest total rate of leaving a state, with a little room so that no state's stay turns negative by rounding. */
function largestOutflow(chain: Chain): number {
  const { rowStart, target, rate, size } = chain
  let largest = 0
  for (let i = 0; i < size; i++) {
    let leaving = 0
    for (let k = rowStart[i]; k < rowStart[i + 1]; k++) if (target[k] !== i) leaving += rate[k]
    if (leaving > largest) largest = leaving
  }
  return largest * 1.02
}

/**
 * Poisson probabilities from `first` on, all that are above 1e-20 of the largest: made outwards from the mode by their
 * ratios and divided by their sum, so that neither an exponential nor a factorial can overflow.
 */
export function poissonWeights(mean: number): { readonly first: number; readonly weights: Float64Array } {
  const negligible = 1e-20
  const mode = Math.floor(mean)
  const below: number[] = []
  for (let k = mode, weight = 1; k > 0 && weight > negligible; k--) {
    weight *= k / mean
    below.push(weight)
  }
  const above: number[] = []
  for (let k = mode + 1, weight = 1; weight > negligible || k <= mean; k++) {
    weight *= mean / k
    above.push(weight)
  }
  const weights = Float64Array.from([...below.reverse(), 1, ...above])
  let total = 0
  for (const weight of weights) total += weight
  for (let k = 0; k < weights.length; k++) weights[k] /= total
  return { first: mode - below.length, weights }
}
