import { incompleteBeta, incompleteGamma, logGamma } from './gamma.js'

/** P(Z > z) of a standard normal variable, with all its digits far out. Source: Abramowitz and Stegun 1964, 26.4.6. */
export function normalTail(z: number): number {
  if (Number.isNaN(z)) throw new RangeError('the tail of NaN')
  return z >= 0 ? incompleteGamma(0.5, (z * z) / 2).upper / 2 : 1 - normalTail(-z)
}

/** z with P(Z > z) = tail, for tail in (0, 1). */
export function normalTailQuantile(tail: number): number {
  if (!(tail > 0 && tail < 1)) throw new RangeError(`no normal quantile of tail ${tail}`)
  if (tail > 0.5) return -normalTailQuantile(1 - tail)
  return solveTail(tail, normalTail, (z) => Math.exp((-z * z) / 2) / Math.sqrt(2 * Math.PI))
}

/**
 * P(T > t) of Student's distribution, for any degrees of freedom above 0. Relative error below 1e-13 up to 5,000
 * degrees of freedom and t of 100, below 1e-10 at a million of them.
 * Source: Abramowitz and Stegun 1964, 26.7.1 with 26.5.27.
 */
export function studentTail(t: number, degreesOfFreedom: number): number {
  if (Number.isNaN(t) || !(degreesOfFreedom > 0)) throw new RangeError(`Student's tail of ${t}, ${degreesOfFreedom}`)
  if (t < 0) return 1 - studentTail(-t, degreesOfFreedom)
  if (t === Number.POSITIVE_INFINITY) return 0
  const square = t * t
  const scale = degreesOfFreedom + square
  return incompleteBeta(degreesOfFreedom / scale, square / scale, degreesOfFreedom / 2, 0.5) / 2
}

/** t with P(T > t) = tail, for tail in (0, 1). */
export function studentTailQuantile(tail: number, degreesOfFreedom: number): number {
  if (!(tail > 0 && tail < 1) || !(degreesOfFreedom > 0)) {
    throw new RangeError(`no Student quantile of tail ${tail}, ${degreesOfFreedom} degrees of freedom`)
  }
  if (tail > 0.5) return -studentTailQuantile(1 - tail, degreesOfFreedom)
  if (tail === 0.5) return 0
  const v = degreesOfFreedom
  const log = logGamma((v + 1) / 2) - logGamma(v / 2) - Math.log(v * Math.PI) / 2
  return solveTail(
    tail,
    (t) => studentTail(t, v),
    (t) => Math.exp(log - ((v + 1) / 2) * Math.log1p((t * t) / v)),
  )
}

/** P(X > x) of a chi-square variable. Source: Abramowitz and Stegun 1964, 26.4.19. */
export const chiSquareTail = (x: number, degreesOfFreedom: number): number =>
  x <= 0 ? 1 : incompleteGamma(degreesOfFreedom / 2, x / 2).upper

/** x with P(X > x) = tail, for tail in (0, 1). */
export function chiSquareTailQuantile(tail: number, degreesOfFreedom: number): number {
  if (!(tail > 0 && tail < 1)) throw new RangeError(`no chi-square quantile of tail ${tail}`)
  const half = degreesOfFreedom / 2
  const density = (x: number) => Math.exp((half - 1) * Math.log(x / 2) - x / 2 - logGamma(half)) / 2
  // On the side where the probability is small, so that it keeps its digits.
  if (tail <= 0.5) return solveTail(tail, (x) => chiSquareTail(x, degreesOfFreedom), density)
  const lower = (x: number) => incompleteGamma(half, x / 2).lower
  return (
    1 /
    solveTail(
      1 - tail,
      (y) => lower(1 / y),
      (y) => density(1 / y) / (y * y),
    )
  )
}

/**
 * x > 0 at which a falling tail has a given value: Newton on its logarithm, which is nearly straight far out, kept
 * inside a bracket that bisection closes where Newton would leave it.
 */
function solveTail(tail: number, tailOf: (x: number) => number, densityOf: (x: number) => number): number {
  if (tail === 0.5 && tailOf(0) === 0.5) return 0
  let low = 0
  let high = 1
  while (tailOf(high) > tail) {
    low = high
    high *= 2
    if (!(high < 1e300)) return high
  }
  let x = low + (high - low) / 2
  for (let step = 0; step < 200; step++) {
    const value = tailOf(x)
    if (value > tail) low = x
    else high = x
    const newton = x + (Math.log(value / tail) * value) / densityOf(x)
    const next = newton > low && newton < high ? newton : low + (high - low) / 2
    if (Math.abs(next - x) <= 2e-16 * Math.abs(x) || next === x) return next
    x = next
  }
  return x
}
