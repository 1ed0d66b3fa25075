import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { incompleteBeta, incompleteGamma, logGamma } from '../../src/numbers/gamma.js'

const relative = (value: number, expected: number): number => Math.abs(value - expected) / Math.abs(expected)

// Expected values by an arbitrary-precision library at 40 digits; arguments are the exact doubles.
describe('ln Γ', () => {
  test.each([
    [1e-10, '23.025850929882735237'],
    [0.1, '2.252712651734205902'],
    [0.5, '0.57236494292470008707'],
    [3, '0.69314718055994530942'],
    [11.999, '17.499865227646105739'], // below 12 it is shifted up, from 12 on it is the series alone
    [12, '17.502307845873885839'],
    [100.5, '361.43554046777762156'],
    [1e6, '12815504.56914761166'],
  ])('of %d: %s', (x, expected) => {
    expect(Math.abs(logGamma(x) - Number(expected))).toBeLessThan(1e-14 * Math.max(1, Number(expected)))
  })
  test('one more multiplies by x: ln Γ(x + 1) - ln Γ(x) = ln x', () =>
    fc.assert(
      fc.property(fc.double({ min: 0.01, max: 200, noNaN: true }), (x) => {
        expect(Math.abs(logGamma(x + 1) - logGamma(x) - Math.log(x))).toBeLessThan(2e-14 * Math.max(1, logGamma(x + 1)))
      }),
      { seed: 7, numRuns: 1000 },
    ))
})

describe('incomplete gamma', () => {
  test.each([
    [0.5, 0.25, '0.52049987781304653768', '0.47950012218695346232'],
    [3, 1, '0.080301397071394196011', '0.91969860292860580399'],
    [3, 3.999, '0.76175013270101617839', '0.23824986729898382161'], // the series up to a + 1
    [3, 4, '0.76189669444645565618', '0.23810330555354434382'], // the continued fraction from there on
    [30, 60, '0.9999931237350312679', '6.8762649687320966864e-6'],
    [1000, 1000, '0.5042052441802155085', '0.4957947558197844915'],
    [1000, 1100, '0.99894067674607002265', '0.0010593232539299773489'],
    [100_000, 99_000, '0.00075741992117476797412', '0.99924258007882523203'],
    [0.01, 0.5, '0.99437324380603281585', '0.005626756193967184147'],
    [5, 40, '0.99999999999949795357', '5.0204643188291333513e-13'],
  ])('a %d, x %d: %s below, %s above', (a, x, below, above) => {
    const { lower, upper } = incompleteGamma(a, x)
    // The series gives the lower one and the fraction the upper one; the other is 1 less it, to 1e-14 of 1.
    const [own, expected, rest] =
      x < a + 1 ? [lower, below, upper - Number(above)] : [upper, above, lower - Number(below)]
    expect(relative(own, Number(expected))).toBeLessThan(2e-13)
    expect(Math.abs(rest)).toBeLessThan(2e-14)
  })
  test('for whole a it is Poisson: k arrivals or more of a mean x', () =>
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 40 }), fc.double({ min: 0.01, max: 80, noNaN: true }), (a, x) => {
        let term = Math.exp(-x)
        let fewer = 0
        for (let k = 0; k < a; k++) {
          fewer += term
          term *= x / (k + 1)
        }
        expect(Math.abs(incompleteGamma(a, x).upper - fewer)).toBeLessThan(2e-14)
        // Where the tail above is small, its own digits are right too: all terms of the sum are positive.
        if (x >= a + 1) expect(relative(incompleteGamma(a, x).upper, fewer)).toBeLessThan(2e-13)
      }),
      { seed: 7, numRuns: 1000 },
    ))
  test('ends', () => {
    expect(incompleteGamma(2, Number.POSITIVE_INFINITY)).toEqual({ lower: 1, upper: 0 })
    expect(incompleteGamma(2, 0)).toEqual({ lower: 0, upper: 1 })
  })
  test.each([
    [0, 1],
    [-1, 1],
    [1, -1],
    [Number.NaN, 1],
    [1, Number.NaN],
  ])('a %d, x %d: refused', (a, x) => {
    expect(() => incompleteGamma(a, x)).toThrow(`incomplete gamma of a ${a}, x ${x}`)
  })
})

describe('incomplete beta', () => {
  test('of halves it is the arc sine: 2/π · asin √x', () =>
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 4095 }), (k) => {
        const x = k / 4096
        expect(relative(incompleteBeta(x, 1 - x, 0.5, 0.5), (2 / Math.PI) * Math.asin(Math.sqrt(x)))).toBeLessThan(
          4e-14,
        )
      }),
      { seed: 7, numRuns: 500 },
    ))
  test('for whole a and b it is binomial: a successes or more in a + b - 1 trials', () =>
    fc.assert(
      fc.property(
        fc.integer({ min: 1, max: 20 }),
        fc.integer({ min: 1, max: 20 }),
        fc.integer({ min: 1, max: 255 }),
        (a, b, k) => {
          const x = k / 256
          const n = a + b - 1
          let sum = 0
          let ways = 1
          for (let successes = 0; successes <= n; successes++) {
            if (successes >= a) sum += ways * x ** successes * (1 - x) ** (n - successes)
            ways = (ways * (n - successes)) / (successes + 1)
          }
          expect(Math.abs(incompleteBeta(x, 1 - x, a, b) - sum)).toBeLessThan(4e-14)
          if (x <= (a + 1) / (a + b + 2)) expect(relative(incompleteBeta(x, 1 - x, a, b), sum)).toBeLessThan(2e-13)
        },
      ),
      { seed: 7, numRuns: 1000 },
    ))
  test('the two sides make 1', () =>
    fc.assert(
      fc.property(
        fc.double({ min: 0.1, max: 500, noNaN: true }),
        fc.double({ min: 0.1, max: 500, noNaN: true }),
        fc.integer({ min: 1, max: 255 }),
        (a, b, k) => {
          const x = k / 256
          expect(incompleteBeta(x, 1 - x, a, b) + incompleteBeta(1 - x, x, b, a)).toBeCloseTo(1, 12)
        },
      ),
      { seed: 7, numRuns: 500 },
    ))
})
