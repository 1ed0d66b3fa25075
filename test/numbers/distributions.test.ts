import { readFileSync } from 'node:fs'
import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import {
  chiSquareTail,
  chiSquareTailQuantile,
  normalTail,
  normalTailQuantile,
  studentTail,
  studentTailQuantile,
} from '../../src/numbers/distributions.js'
import { incompleteBeta, incompleteGamma, logGamma } from '../../src/numbers/gamma.js'

const relative = (value: number, expected: number): number => Math.abs(value - expected) / Math.abs(expected)
const reference = (id: string): [degreesOfFreedom: number, probability: number, value: number][] => {
  const file = readFileSync(new URL('../published/references/critical-values.json', import.meta.url), 'utf8')
  const { values } = JSON.parse(file).cases.find((each: { id: string }) => each.id === id)
  return Object.entries(values).map(([key, value]) => {
    const [, degreesOfFreedom, probability] = /^df(\d+)_q(.+)$/.exec(key) as RegExpExecArray
    return [Number(degreesOfFreedom), Number(probability), Number(value)]
  })
}
const exactTail = (probability: number): number => Number((1 - probability).toFixed(12))

// critical-values.json: Abramowitz and Stegun 1964, tables 26.8 and 26.10, computed there to 25 digits.
describe('critical values', () => {
  test.each(reference('Student-t-quantiles'))('Student, %i degrees of freedom, %d: %d', (v, q, value) => {
    expect(relative(studentTailQuantile(exactTail(q), v), value)).toBeLessThan(1e-14)
    expect(relative(studentTail(value, v), exactTail(q))).toBeLessThan(1e-13)
  })
  test.each(reference('chi-square-quantiles'))('chi-square, %i degrees of freedom, %d: %d', (v, q, value) => {
    expect(relative(chiSquareTailQuantile(exactTail(q), v), value)).toBeLessThan(1e-13)
    expect(relative(chiSquareTail(value, v), exactTail(q))).toBeLessThan(1e-13)
  })
  test('two-sided 95 % of the normal: 1.959963984540054235524594430520551', () => {
    expect(relative(normalTailQuantile(0.025), Number('1.959963984540054235524594430520551'))).toBeLessThan(1e-15)
  })
})

// Tails by an arbitrary-precision library (erfc, regularised incomplete gamma and beta at 40 digits), arguments exact
// doubles. The tolerance is four times the error measured.
describe('tails', () => {
  test.each([
    [0.5, '0.30853753872598689636'],
    [1.75, '0.040059156863817090419'],
    [8, '6.2209605742717841235e-16'],
    [20, '2.7536241186062336951e-89'],
    [37, '5.7255712225245768227e-300'],
  ])('normal beyond %d: %s', (z, expected) => {
    expect(relative(normalTail(z), Number(expected))).toBeLessThan(1.6e-13)
    expect(normalTail(-z)).toBe(1 - normalTail(z))
  })
  test.each(studentTails())('Student beyond t = %d, %d degrees of freedom: %s', (t, v, expected) => {
    expect(relative(studentTail(t, v), Number(expected))).toBeLessThan(1.6e-13)
  })
  test.each(chiSquareTails())('chi-square beyond %d, %d degrees of freedom: %s', (x, v, expected) => {
    expect(relative(chiSquareTail(x, v), Number(expected))).toBeLessThan(1.6e-13)
  })
})

describe('identities', () => {
  // Closed forms: Student with 1 degree of freedom is Cauchy's, with 2 it is algebraic; chi-square with 2 exponential.
  test('Student with 1 and 2 degrees of freedom, chi-square with 2', () =>
    fc.assert(
      fc.property(fc.double({ min: 1e-3, max: 1e3, noNaN: true }), (t) => {
        expect(relative(studentTail(t, 1), Math.atan2(1, t) / Math.PI)).toBeLessThan(1e-13)
        const root = Math.sqrt(t * t + 2)
        expect(relative(studentTail(t, 2), 1 / (root * (root + t)))).toBeLessThan(1e-13)
        if (t < 700) expect(relative(chiSquareTail(t, 2), Math.exp(-t / 2))).toBeLessThan(2e-13)
      }),
      { seed: 7, numRuns: 500 },
    ))
  // The definition as an integral, Student's density by Simpson's rule: shares nothing with the continued fraction.
  test.each([3, 7, 15, 31])('the tail is the integral of the density, %i degrees of freedom', (v) => {
    let normaliser = v % 2 === 1 ? 1 / Math.PI : 0.5
    for (let k = v % 2 === 1 ? 1 : 2; k < v; k += 2) normaliser *= (k + 1) / k
    const density = (t: number) => (normaliser / Math.sqrt(v)) * (1 + (t * t) / v) ** (-(v + 1) / 2)
    const n = 4000
    const h = 2.5 / n
    let sum = density(0) + density(2.5)
    for (let i = 1; i < n; i++) sum += density(i * h) * (i % 2 === 1 ? 4 : 2)
    expect(studentTail(2.5, v)).toBeCloseTo(0.5 - (sum * h) / 3, 12)
  })
  test('a quantile is where its tail is, down to 1e-200', () =>
    fc.assert(
      fc.property(fc.double({ min: -200, max: -0.4, noNaN: true }), fc.integer({ min: 1, max: 500 }), (log, v) => {
        const tail = 10 ** log
        expect(relative(normalTail(normalTailQuantile(tail)), tail)).toBeLessThan(1e-12)
        expect(relative(studentTail(studentTailQuantile(tail, v), v), tail)).toBeLessThan(1e-12)
        expect(relative(chiSquareTail(chiSquareTailQuantile(tail, v), v), tail)).toBeLessThan(1e-12)
      }),
      { seed: 7, numRuns: 300 },
    ))
  test('quantiles above a half mirror those below; the median of the symmetric ones is 0', () => {
    expect(studentTailQuantile(0.75, 5)).toBe(-studentTailQuantile(0.25, 5))
    expect(normalTailQuantile(0.75)).toBe(-normalTailQuantile(0.25))
    expect(studentTailQuantile(0.5, 5)).toBe(0)
    expect(normalTailQuantile(0.5)).toBe(0)
    expect(studentTail(0, 5)).toBe(0.5)
  })
  test('ends: nothing lies beyond infinity, all beyond 0', () => {
    expect(studentTail(Number.POSITIVE_INFINITY, 3)).toBe(0)
    expect(normalTail(Number.POSITIVE_INFINITY)).toBe(0)
    expect(chiSquareTail(0, 3)).toBe(1)
    expect(chiSquareTail(-1, 3)).toBe(1)
    expect(incompleteGamma(2, 0)).toEqual({ lower: 0, upper: 1 })
    expect(incompleteBeta(0, 1, 2, 3)).toBe(0)
    expect(incompleteBeta(1, 0, 2, 3)).toBe(1)
  })
  test('incomplete beta: 6x² - 8x³ + 3x⁴ for a = 2, b = 3', () =>
    fc.assert(
      fc.property(fc.integer({ min: 1, max: 1023 }), (k) => {
        const x = k / 1024
        expect(relative(incompleteBeta(x, 1 - x, 2, 3), x * x * (6 - 8 * x + 3 * x * x))).toBeLessThan(1e-13)
      }),
      { seed: 7 },
    ))
  test('ln Γ at whole and half numbers', () => {
    let factorial = 0
    for (let n = 1; n < 60; n++) {
      expect(Math.abs(logGamma(n) - factorial)).toBeLessThan(1e-14 * Math.max(1, factorial))
      factorial += Math.log(n)
    }
    expect(Math.abs(logGamma(0.5) - Math.log(Math.PI) / 2)).toBeLessThan(1e-14)
  })
})

describe('refused', () => {
  test.each([0, 1, -0.1, 1.1, Number.NaN])('a tail of %d has no quantile', (tail) => {
    expect(() => normalTailQuantile(tail)).toThrow(RangeError)
    expect(() => studentTailQuantile(tail, 3)).toThrow(RangeError)
    expect(() => chiSquareTailQuantile(tail, 3)).toThrow(RangeError)
  })
  test('NaN and no degrees of freedom', () => {
    expect(() => normalTail(Number.NaN)).toThrow(RangeError)
    expect(() => studentTail(Number.NaN, 3)).toThrow(RangeError)
    expect(() => studentTail(1, 0)).toThrow(RangeError)
    expect(() => studentTailQuantile(0.1, Number.NaN)).toThrow(RangeError)
    expect(() => incompleteGamma(0, 1)).toThrow(RangeError)
    expect(() => incompleteGamma(1, -1)).toThrow(RangeError)
  })
})

function studentTails(): [number, number, string][] {
  return [
    [3.5, 0.5, '0.17039265997178977346'],
    [100, 1, '0.0031829927649082551491'],
    [0.7, 2, '0.27819651231643274159'],
    [6, 3, '0.0046363574461423337021'],
    [1, 4, '0.1869504831500294425'],
    [15, 7, '7.0258481240469838089e-7'],
    [2, 15, '0.031972503642360101426'],
    [3.5, 31, '0.00071652139387360935334'],
    [100, 127, '6.2281033397348799477e-123'],
    [2, 511, '0.023014519418354854919'],
    [2, 4095, '0.022783097286187121703'],
    [15, 4095, '7.4370387712276966524e-50'],
  ]
}

function chiSquareTails(): [number, number, string][] {
  return [
    [0.01, 1, '0.92034432544594203624'],
    [2.0, 1, '0.15729920705028513066'],
    [2.6, 2, '0.27253179303401259102'],
    [27.0, 3, '5.8873555835776636804e-6'],
    [4.75, 5, '0.44714590163950105366'],
    [10.5, 10, '0.39777368107622833947'],
    [124.0, 31, '4.4837528106323743734e-13'],
    [1143.0, 127, '5.8574347120879704789e-163'],
    [511.0, 511, '0.49168039476630742946'],
    [4750.0, 5000, '0.99439735895052199157'],
    [6500.0, 5000, '3.6294973184379172592e-43'],
  ]
}
