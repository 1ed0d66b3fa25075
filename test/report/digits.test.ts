import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import {
  amount,
  boundDigits,
  countInWords,
  estimateDigits,
  exactDigits,
  inUnits,
  percentDigits,
  significant,
} from '../../src/report/digits.js'

describe('an exact value is shown with the digits that its bound supports, six at most', () => {
  test.each([
    // value, bound, shown
    [19.91949400517, 8e-15, '19.9195'],
    [0.114689155323, 1.4e-16, '0.114689'],
    [0.5, 1e-16, '0.500000'],
    [0.114689155323, 0.0004, '0.11'],
    [0.114689155323, 0.2, '0.1'],
    [24, 0, '24'],
    [1 / 3, 0, '0.333333'],
    [0, 0, '0'],
    [-19.91949400517, 8e-15, '-19.9195'],
    [123_456.789, 1e-9, '123,457'],
    [6_987_654_321, 1e-3, '6.98765e9'],
    [1.23456789e-9, 1e-20, '1.23457e-9'],
    [Number.POSITIVE_INFINITY, 0, 'Infinity'],
  ])('%d known to %d reads %s', (value, bound, shown) => expect(exactDigits(value, bound)).toBe(shown))

  test('twelve where twelve are asked for', () => expect(exactDigits(1 / 3, 1e-16, 12)).toBe('0.333333333333'))

  test('what is shown is the value rounded at its last supported digit', () =>
    fc.assert(
      fc.property(fc.double({ min: 1e-5, max: 1e8, noNaN: true }), fc.integer({ min: 0, max: 14 }), (value, digits) => {
        const shown = exactDigits(value, (value / 2) * 10 ** -digits) // supports just so many digits
        const unit = 10 ** (Math.floor(Math.log10(value)) - Math.max(1, Math.min(6, digits)) + 1)
        expect(Math.abs(Number(shown.replaceAll(',', '')) - value)).toBeLessThanOrEqual(0.5000001 * unit)
      }),
      { seed: 7 },
    ))
})

describe('a bound is rounded up, so that what is shown is a bound too', () => {
  test.each([
    [1.4e-16, '2e-16'],
    [1e-14, '1e-14'],
    [9.2e-15, '1e-14'],
    [0.003, '3e-3'],
    [0, '0'],
  ])('%d reads %s', (bound, shown) => expect(boundDigits(bound)).toBe(shown))

  test('no bound is shown smaller than it is', () =>
    fc.assert(
      fc.property(fc.double({ min: 1e-300, max: 1e300, noNaN: true }), (bound) => {
        expect(Number(boundDigits(bound))).toBeGreaterThanOrEqual(bound)
        expect(Number(boundDigits(bound))).toBeLessThanOrEqual(2.0000001 * bound)
      }),
      { seed: 7 },
    ))
})

describe('an estimate ends at the second digit of its half-width', () => {
  test.each([
    // estimate, half-width, both as shown
    [19.92123, 0.0163, '19.921', '0.016'],
    [0.114912, 0.00072, '0.11491', '0.00072'],
    [139.0234, null, '139.0', ''],
    [24, 0, '24', '0'],
    [1234.56, 78.9, '1235', '79'],
    [12_345.6, 789.1, '12,350', '790'],
    [1.2345e-7, 3.21e-9, '1.235e-7', '3.2e-9'],
    [0, 0.01, '0.000', '0.010'],
    [-7.32159, 0.25, '-7.32', '0.25'],
  ])('%d ± %d reads %s ± %s', (estimate, halfWidth, shown, width) =>
    expect(estimateDigits(estimate, halfWidth)).toEqual({ estimate: shown, halfWidth: width }),
  )
})

describe('shares, counts and times', () => {
  test.each([
    [0.0017, '0.2 %'],
    [0.00002, '0.0 %'],
    [-0.028, '2.8 %'],
    [0.354, '35 %'],
    [0, '0.0 %'],
    [1e7, 'over 10⁶ %'],
  ])('a difference of %d is %s', (share, shown) => expect(percentDigits(share)).toBe(shown))

  test.each([
    [5_412_345, '5.4 million'],
    [38_300_000, '38.3 million'],
    [12_345, '12,345'],
    [2_000_000_000, '2.0 billion'],
  ])('%d is %s', (count, shown) => expect(countInWords(count)).toBe(shown))

  test.each([
    [1, 'hour', '1 hour'],
    [20_000, 'hour', '20,000 hours'],
    [2000, 'hours', '2000 hours'],
    [0.25, 'day', '0.25 days'],
    [1.23456, 'day', '1.235 days'],
  ])('%d %s reads %s', (value, unit, shown) => expect(inUnits(value, unit)).toBe(shown))

  test('a number keeps the zeros that are known and drops those that are not asked for', () => {
    expect(significant(0.5, 4)).toBe('0.5000')
    expect(amount(0.5)).toBe('0.5')
  })
})
