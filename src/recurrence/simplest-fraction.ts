import { add, compare, divide, equal, type Fraction, fraction, one, subtract, zero } from '../numbers/fraction.js'

/** The fraction with the smallest denominator between two, ends included (the mediant search of Stern and Brocot). */
export function simplestBetween(a: Fraction, b: Fraction): Fraction {
  const [low, high] = compare(a, b) <= 0 ? [a, b] : [b, a]
  if (high.numerator < 0n) {
    const mirrored = simplestBetween(subtract(zero, high), subtract(zero, low))
    return subtract(zero, mirrored)
  }
  if (low.numerator <= 0n) return zero
  const whole = low.numerator / low.denominator
  const floor = fraction(whole)
  if (equal(floor, low)) return low
  const next = fraction(whole + 1n)
  if (compare(next, high) <= 0) return next
  const rest = simplestBetween(divide(one, subtract(high, floor)), divide(one, subtract(low, floor)))
  return add(floor, divide(one, rest))
}
