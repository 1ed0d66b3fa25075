import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import {
  add,
  divide,
  floor,
  fraction,
  fractionOfDouble,
  fractionOfText,
  multiply,
  toNumber,
  toText,
} from '../../src/numbers/fraction.js'

const anyFraction = fc
  .tuple(fc.bigInt({ min: -(10n ** 30n), max: 10n ** 30n }), fc.bigInt({ min: 1n, max: 10n ** 30n }))
  .map(([n, d]) => fraction(n, d))

describe('toNumber', () => {
  // JavaScript's own reading of a decimal is correctly rounded (ECMA-262, StringToNumber): an oracle not written here.
  test('the nearest double to a written decimal, over the whole range', () =>
    fc.assert(
      fc.property(fc.bigInt({ min: 1n, max: 10n ** 40n }), fc.integer({ min: -370, max: 300 }), (digits, exponent) => {
        const text = `${digits}e${exponent}`
        expect(toNumber(fractionOfText(text)!)).toBe(Number(text))
      }),
      { seed: 7, numRuns: 5000 },
    ))
  test('a double goes there and back', () =>
    fc.assert(
      fc.property(fc.double({ noNaN: true, noDefaultInfinity: true }), (value) => {
        expect(toNumber(fractionOfDouble(value))).toBe(value + 0)
      }),
      { seed: 7, numRuns: 5000 },
    ))
  test.each([
    '5e-324',
    '2.4703282292062327e-324',
    '2.4703282292062328e-324',
    '1.7976931348623157e308',
    '1e309',
    '2.2250738585072011e-308',
  ])('%s at the edge of the range', (text) => expect(toNumber(fractionOfText(text)!)).toBe(Number(text)))
})

describe('fractionOfText', () => {
  test.each([
    ['12', '12'],
    ['-0.5', '-1/2'],
    ['1e-9', '1/1000000000'],
    ['1/3', '1/3'],
    ['2.5/7', '5/14'],
    [' 3 / 6 ', '1/2'],
    ['.5', '1/2'],
    ['5.', '5'],
    ['0/7', '0'],
  ])('%j is %s', (text, value) => expect(toText(fractionOfText(text)!)).toBe(value))
  test.each(['', '.', 'x', '1/0', '1/2/3', '1e401', '0x10', 'Infinity', 'NaN', '1 2', '--1'])(
    '%j is no number',
    (text) => expect(fractionOfText(text)).toBeUndefined(),
  )
})

test('a / b · b is a, and a + b - b is a, exactly', () =>
  fc.assert(
    fc.property(anyFraction, anyFraction, (a, b) => {
      fc.pre(b.numerator !== 0n)
      expect(multiply(divide(a, b), b)).toEqual(a)
      expect(add(add(a, b), fraction(-b.numerator, b.denominator))).toEqual(a)
    }),
    { seed: 7 },
  ))

test.each([
  ['7/2', 3n],
  ['-7/2', -4n],
  ['-4', -4n],
])('floor of %s is %s', (text, value) => expect(floor(fractionOfText(text)!)).toBe(value))
