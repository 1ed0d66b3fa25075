/**
 * What Stirling's formula leaves out: ln Γ(x) − [(x − 1/2) ln x − x + ln √(2π)], for x > 0.
 * Source: Abramowitz and Stegun 1964, 6.1.41 (series) from x = 12 on, shifted there by 6.1.15.
 */
function stirlingError(x: number): number {
  if (x < 12) return logGamma(x) - (x - 0.5) * Math.log(x) + x - logRootOfTwoPi
  const inverse = 1 / (x * x)
  return (
    (1 / 12 -
      inverse *
        (1 / 360 -
          inverse *
            (1 / 1260 - inverse * (1 / 1680 - inverse * (1 / 1188 - inverse * (691 / 360360 - inverse / 156)))))) /
    x
  )
}

const logRootOfTwoPi = 0.9189385332046727

/**
 * Logarithm of the gamma function for x > 0, to 1e-14 of max(1, |result|).
 * Source: Abramowitz and Stegun 1964, 6.1.40 from x = 12 on, shifted there by 6.1.15.
 */
export function logGamma(x: number): number {
  let shifted = x
  let product = 1
  while (shifted < 12) product *= shifted++
  return (shifted - 0.5) * Math.log(shifted) - shifted + logRootOfTwoPi + stirlingError(shifted) - Math.log(product)
}

/**
 * ln(at / centre) − (at − centre) / centre without cancellation near the centre; at, centre > 0. It is never positive.
 * Source: with s = d/(2 + d) and ln(1 + d) = 2(s + s³/3 + s⁵/5 + …), Abramowitz and Stegun 1964, 4.1.27.
 *
 * @param gap at − centre, given apart since the caller may know it with more digits
 */
function logarithmBelowTangent(at: number, centre: number, gap: number): number {
  const d = gap / centre
  if (Math.abs(d) > 0.5) return Math.log(at / centre) - d
  const s = d / (2 + d)
  const square = s * s
  let sum = 0
  let power = s * square
  for (let k = 3; ; k += 2) {
    const next = sum + power / k
    if (next === sum) break
    sum = next
    power *= square
  }
  return 2 * sum - s * d
}

/**
 * Regularised incomplete gamma functions: P(a, x) below and Q(a, x) above, for a > 0, x >= 0.
 * Source: Abramowitz and Stegun 1964, 6.5.29 (series) where x < a + 1, else 6.5.31 (continued fraction, by Lentz's
 * method). The power in front is taken around its peak (Loader 2000, from memory), so that large a cost no digits.
 */
export function incompleteGamma(a: number, x: number): { readonly lower: number; readonly upper: number } {
  if (!(a > 0) || !(x >= 0)) throw new RangeError(`incomplete gamma of a ${a}, x ${x}`)
  if (x === 0) return { lower: 0, upper: 1 }
  if (x === Number.POSITIVE_INFINITY) return { lower: 1, upper: 0 }
  const front = Math.sqrt(a / (2 * Math.PI)) * Math.exp(a * logarithmBelowTangent(x, a, x - a) - stirlingError(a))
  if (x < a + 1) {
    let term = 1 / a
    let sum = term
    for (let k = 1; term > sum * 1e-17; k++) {
      term *= x / (a + k)
      sum += term
    }
    const lower = Math.min(1, front * sum)
    return { lower, upper: 1 - lower }
  }
  let b = x + 1 - a
  let c = 1e300
  let d = 1 / b
  let fraction = d
  for (let k = 1; k < 100_000; k++) {
    const an = -k * (k - a)
    b += 2
    d = 1 / (an * d + b)
    c = b + an / c
    const step = c * d
    fraction *= step
    if (Math.abs(step - 1) <= Number.EPSILON) break
  }
  const upper = Math.min(1, front * fraction)
  return { lower: 1 - upper, upper }
}

/**
 * Regularised incomplete beta function I_x(a, b), 0 <= x <= 1, with y = 1 - x given apart, so that a tail keeps its
 * digits when x is near 1. The power in front as above.
 * Source: Abramowitz and Stegun 1964, 26.5.8 (continued fraction), by Lentz's method; 26.5.2 on the other side.
 */
export function incompleteBeta(x: number, y: number, a: number, b: number): number {
  if (x <= 0) return 0
  if (y <= 0) return 1
  if (x > (a + 1) / (a + b + 2)) return 1 - incompleteBeta(y, x, b, a)
  const gap = x * b - y * a // a/(a + b) and b/(a + b) are where the power peaks
  const exponent =
    a * logarithmBelowTangent(x * (a + b), a, gap) +
    b * logarithmBelowTangent(y * (a + b), b, -gap) +
    stirlingError(a + b) -
    stirlingError(a) -
    stirlingError(b)
  const front = Math.sqrt(b / (2 * Math.PI * (a + b) * a)) * Math.exp(exponent)
  let c = 1
  let d = 1 / (1 - ((a + b) * x) / (a + 1))
  let fraction = d
  for (let m = 1; m < 100_000; m++) {
    const even = (m * (b - m) * x) / ((a + 2 * m - 1) * (a + 2 * m))
    d = 1 / (1 + even * d)
    c = 1 + even / c
    fraction *= d * c
    const odd = (-(a + m) * (a + b + m) * x) / ((a + 2 * m) * (a + 2 * m + 1))
    d = 1 / (1 + odd * d)
    c = 1 + odd / c
    const step = d * c
    fraction *= step
    if (Math.abs(step - 1) <= Number.EPSILON) break
  }
  return front * fraction
}
