import { expect, test } from 'vitest'
import { roundedUp } from '../../src/comparison/run-findings.js'
import { inUnits, percent, shown } from '../../src/comparison/shown-number.js'

test.each([
  [0, '0'],
  [0.114689, '0.1147'],
  [-0.114689, '-0.1147'],
  [9999.4, '9999'],
  [10_000.6, '10,001'],
  [1234567, '1,234,567'],
  [1e7, '1e+7'],
  [12_345_678, '1.235e+7'],
  [1e-5, '0.00001'],
  [9.9e-6, '9.9e-6'],
  [1.2345e-9, '1.235e-9'],
  [Number.POSITIVE_INFINITY, 'Infinity'],
])('%d is shown as %s', (value, text) => {
  expect(shown(value)).toBe(text)
})
test('with more digits or fewer', () => {
  expect(shown(0.1146891, 6)).toBe('0.114689')
  expect(shown(0.1146891, 2)).toBe('0.11')
  expect(percent(0.0278)).toBe('2.78 %')
})
test.each([
  [1, 'hour', '1 hour'],
  [-1, 'hour', '-1 hour'],
  [2, 'hour', '2 hours'],
  [0.5, 'hour', '0.5 hours'],
  [3, 'hours', '3 hours'],
])('%d of %s: %s', (value, unit, text) => {
  expect(inUnits(value, unit)).toBe(text)
})
// A length to be pasted is never below what is needed, nor rounded up twice.
test.each([
  [80_000, 80_000],
  [80_001, 81_000],
  [123, 130],
  [100, 100],
  [99.5, 100],
  [1, 1],
  [0.123, 0.13],
  [0.3, 0.3],
])('%d is rounded up to %d', (value, rounded) => {
  expect(roundedUp(value)).toBe(rounded)
})
