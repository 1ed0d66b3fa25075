import type { SolvedClass } from '../stationary/solved-class.js'

/**
 * Relative values of a function f of the state on one closed class: g with -Q g = f - πf (or (I - P) g = f - πf) and
 * π g = 0, by the elimination that solved the class. g(i) is the whole of what starting in i adds to the sum of f over
 * all time, against starting in the long run: the row i of the deviation matrix times f.
 *
 * Source: Kemeny and Snell 1960, chapter 4; Glynn 1984 (both from memory).
 *
 * @param f length n of the class
 * @returns length n of the class; unit of f × time
 */
export function relativeValues(solved: SolvedClass, f: Float64Array): Float64Array {
  const { share } = solved
  const n = share.length
  let mean = 0
  for (let i = 0; i < n; i++) mean += share[i] * f[i]
  const centred = new Float64Array(n)
  for (let i = 0; i < n; i++) centred[i] = f[i] - mean
  const values = n === 1 ? new Float64Array(1) : solved.poisson(centred)
  let shift = 0
  for (let i = 0; i < n; i++) shift += share[i] * values[i]
  for (let i = 0; i < n; i++) values[i] -= shift
  return values
}
