import { expect, test } from 'vitest'
import { add, divide, type Fraction, fraction, multiply, one, toNumber, zero } from '../../src/numbers/fraction.js'
import type { BirthDeath } from '../../src/recurrence/classification.js'
import { birthDeathShares, doubled, tailOf } from '../../src/stationary/birth-death.js'

const process = (birth: Fraction[], death: Fraction[], deathBelow = zero): BirthDeath => ({
  form: 'birth-death',
  time: 'continuous',
  element: 0,
  state: [0],
  first: 0,
  outward: 1,
  birthBelow: [birth[0]],
  deathBelow: [deathBelow],
  beyond: 1,
  birth: { numerator: birth, denominator: [one] },
  death: { numerator: death, denominator: [one] },
})

test('each share of a Poisson count is right to its last digit', () => {
  // Mean 30: shares in exact fractions, the sum carried to 400 counts, beyond which less than 1e-300 lies.
  const { share, relativeError } = birthDeathShares(process([fraction(30)], [zero, one]), [1])
  let weight: Fraction = one
  let total: Fraction = zero
  const weights: Fraction[] = []
  for (let n = 0; n < 200; n++) {
    weights.push(weight)
    total = add(total, weight)
    weight = multiply(weight, fraction(30, n + 1))
  }
  for (const n of [0, 1, 17, 30, 60, 100]) {
    const exact = toNumber(divide(weights[n], total))
    expect(Math.abs(share[n] - exact)).toBeLessThanOrEqual(2 ** -52 * exact)
  }
  expect(relativeError).toBeLessThan(1.2e-16)
})

test('what lies beyond the last count is bounded from above, and closely', () => {
  const shares = birthDeathShares(process([one], [fraction(2)]), [0, 1])
  const last = shares.share.length - 1
  const beyond = tailOf(shares, [1])
  expect(beyond).toBeGreaterThanOrEqual(shares.share[last])
  expect(beyond).toBeLessThan(1.001 * shares.share[last])
  // Σ n p(n) beyond: p(last) (last + 2).
  expect(tailOf(shares, [0, 1])).toBeGreaterThanOrEqual(shares.share[last] * (last + 2))
  expect(tailOf(shares, [0, 1])).toBeLessThan(1.1 * shares.share[last] * (last + 2))
})

test('a ratio that rises towards its limit is bounded by the limit', () => {
  // (n + 1)/2 up, n down: the ratio is exactly 1/2; n/2 + 1/4 up: (2n + 1)/(4n + 4) rises to 1/2.
  const { ratio, share } = birthDeathShares(process([fraction(1, 4), fraction(1, 2)], [zero, one]), [1])
  const [last, before] = [share[share.length - 1], share[share.length - 2]]
  expect(ratio).toBeGreaterThanOrEqual(last / before)
  expect(ratio).toBeLessThan(0.5 + 1e-12)
})

test('shares that fall like a power are refused', () => {
  // Up n + 1, down n + 3: p(n) falls like n^-3.
  expect(() => birthDeathShares(process([one, one], [fraction(3), one]), [1])).toThrow(/fall too slowly/)
})

test('a fraction in doubled precision', () => {
  const [high, low] = doubled(fraction(1, 3))
  expect(high).toBe(1 / 3)
  expect(low).toBe(1.850371707708594e-17) // 1/3 - 0x1.5555555555555p-2, by hand 2^-54/3
})
