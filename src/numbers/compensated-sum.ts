import { productError, sumError } from './double-double.js'

/**
 * Sum as if in doubled precision, rounded once.
 *
 * Source: Ogita, Rump and Oishi 2005 (Sum2), from memory: error at most u·|sum| + 2n²u²·Σ|values|, u = 2⁻⁵³.
 */
export function compensatedSum(values: ArrayLike<number>): number {
  let sum = 0
  let lost = 0
  for (let i = 0; i < values.length; i++) {
    const next = sum + values[i]
    lost += sumError(sum, values[i], next)
    sum = next
  }
  return sum + lost
}

/**
 * Σ a_i b_i as if in doubled precision, rounded once.
 *
 * Source: Ogita, Rump and Oishi 2005 (Dot2), from memory: error at most u·|sum| + 2n²u²·Σ|a_i b_i|, u = 2⁻⁵³, where
 * no product underflows.
 */
export function compensatedDot(a: ArrayLike<number>, b: ArrayLike<number>): number {
  let sum = 0
  let lost = 0
  for (let i = 0; i < a.length; i++) {
    const product = a[i] * b[i]
    const next = sum + product
    lost += productError(a[i], b[i], product) + sumError(sum, product, next)
    sum = next
  }
  return sum + lost
}
