/**
 * Building blocks of doubled precision: what a rounded sum or product lost, exactly. A number is then held as the
 * unevaluated sum of two doubles, about 106 bits.
 *
 * Sources: Knuth 1969 (sum), Dekker 1971 and Veltkamp 1968 (product, without a fused multiply-add), from memory.
 */

/** Half the distance from 1 to the next double: the largest relative error of one rounding. */
export const unitRoundoff = 2 ** -53

/** @returns a + b - sum exactly, where sum is the rounded a + b; no overflow */
export function sumError(a: number, b: number, sum: number): number {
  const shadow = sum - a
  return a - (sum - shadow) + (b - shadow)
}

/** 2²⁷ + 1 splits a double into halves whose products are exact. */
const splitter = 134217729

/** @returns a·b - product exactly, where product is the rounded a·b; |a|, |b| below 2⁹⁹⁶ and product above 2⁻⁹⁶⁹ or 0 */
export function productError(a: number, b: number, product: number): number {
  const scaledA = splitter * a
  const highA = scaledA - (scaledA - a)
  const lowA = a - highA
  const scaledB = splitter * b
  const highB = scaledB - (scaledB - b)
  const lowB = b - highB
  return lowA * lowB - (product - highA * highB - lowA * highB - highA * lowB)
}
