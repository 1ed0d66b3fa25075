import { compensatedDot } from '../numbers/compensated-sum.js'
import { generatorImage } from './poisson-residual.js'
import type { SolvedClass } from './solved-class.js'

/** A function of the state on one closed class: length n of the class each. */
export interface StateFunction {
  readonly value: Float64Array
  /** Bound on the error of each value against the numbers as written. */
  readonly error: Float64Array
}

export interface BoundedValue {
  readonly value: number
  readonly errorBound: number
}

/**
 * Long-run mean of a function of the state, with a bound on its error against the numbers as written.
 *
 * Let h be any vector (here the computed solution of Q h = f - c, c the computed mean), and e = Q h - f + c what it
 * misses. Then the computed mean is off by exactly r·h + (π - π̃)·e, r the residual of the balance equations. The first
 * term is evaluated with its sign, the second is small twice over. Errors of the rates enter both r and e. So the bound
 * stays true however h was computed, and is sharp where h is good.
 */
export function meanValue(solved: SolvedClass, f: StateFunction, sharp = true): BoundedValue {
  const { chain, share, balance, relativeError, spreadError, sumError } = solved
  const n = chain.size
  const value = compensatedDot(share, f.value)
  let lowest = Number.POSITIVE_INFINITY
  let highest = Number.NEGATIVE_INFINITY
  let magnitude = 0
  let valueError = 0
  let largestValueError = 0
  for (let i = 0; i < n; i++) {
    const each = f.value[i]
    if (each < lowest) lowest = each
    if (each > highest) highest = each
    magnitude += share[i] * Math.abs(each)
    valueError += share[i] * f.error[i]
    if (f.error[i] > largestValueError) largestValueError = f.error[i]
  }
  /** The shares' own error on a function without sign, of which mean and maximum are known. */
  const changeOf = (mean: number, most: number) =>
    most === 0 ? 0 : Math.min(mean === 0 ? 0 : relativeError * mean, spreadError * most)
  const apart =
    valueError +
    changeOf(valueError, largestValueError) +
    2 ** -52 * Math.abs(value) +
    2 ** -85 * magnitude +
    Number.MIN_VALUE
  const slack = 1 + 2 ** -20 // covers the rounding of the bound itself
  const plain = changeOf(magnitude, highest - lowest)
  if (!sharp || n === 1 || highest === lowest) {
    const certain = highest === lowest ? 0 : plain
    return { value: highest === lowest ? highest : value, errorBound: (certain + apart) * slack }
  }
  const reward = new Float64Array(n)
  for (let i = 0; i < n; i++) reward[i] = value - f.value[i]
  const h = solved.poisson(reward)
  const { image, evaluationError, inputError } = generatorImage(chain, h)
  let first = 0
  let firstError = 0
  let missedMean = 0
  let missedMost = 0
  for (let i = 0; i < n; i++) {
    const term = balance.residual[i] * h[i]
    first += term
    firstError += (2 ** -50 * Math.abs(balance.residual[i]) + balance.evaluationError[i]) * Math.abs(h[i])
    firstError += n * 2 ** -53 * Math.abs(term) + share[i] * inputError[i]
    const missed = Math.abs(image[i] + reward[i]) + evaluationError[i] + inputError[i] + 2 ** -52 * Math.abs(reward[i])
    missedMean += share[i] * missed
    if (missed > missedMost) missedMost = missed
  }
  const second = changeOf(missedMean, 2 * missedMost)
  const through = Math.abs(first) + firstError + second + Math.abs(value) * sumError
  const best = Math.min(plain, Number.isNaN(through) ? Number.POSITIVE_INFINITY : through)
  return { value, errorBound: (best + apart) * slack }
}
