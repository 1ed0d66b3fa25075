import fc from 'fast-check'
import { expect, test } from 'vitest'
import { aliasTables, lawOf } from '../../src/simulation/alias-table.js'

/** Rows of rates over 24 decades, a few empty. */
const rows = fc.array(
  fc.array(
    fc.double({ min: -12, max: 12, noNaN: true }).map((exponent) => 10 ** exponent),
    { maxLength: 40 },
  ),
  { minLength: 1, maxLength: 6 },
)

test('every arc is chosen with its rate over the total, to rounding, however rare it is', () =>
  fc.assert(
    fc.property(rows, (rates) => {
      const rowStart = Int32Array.from([0, ...rates.map((_, i) => rates.slice(0, i + 1).flat().length)])
      const chain = { size: rates.length, rowStart, rate: Float64Array.from(rates.flat()) }
      const tables = aliasTables(chain)
      const law = lawOf(tables, chain)
      rates.forEach((row, i) => {
        const total = row.reduce((sum, rate) => sum + rate, 0)
        if (row.length === 0) expect(tables.meanHolding[i]).toBe(Number.POSITIVE_INFINITY)
        else expect(Math.abs(tables.meanHolding[i] * total - 1)).toBeLessThan((row.length + 2) * Number.EPSILON)
        row.forEach((rate, k) => {
          const wanted = rate / total
          expect(Math.abs(law[rowStart[i] + k] - wanted)).toBeLessThanOrEqual(
            4 * (row.length + 1) * Number.EPSILON * wanted,
          )
        })
      })
    }),
    { seed: 11, numRuns: 2000 },
  ))

test('an arc chosen once in 10^15 times keeps its probability to rounding', () => {
  const chain = { size: 1, rowStart: Int32Array.of(0, 3), rate: Float64Array.of(1, 1e-15, 2) }
  const [, rare] = lawOf(aliasTables(chain), chain)
  expect(Math.abs(rare / (1e-15 / 3) - 1)).toBeLessThan(1e-14)
})

test('aliases stay within the row', () =>
  fc.assert(
    fc.property(rows, (rates) => {
      const rowStart = Int32Array.from([0, ...rates.map((_, i) => rates.slice(0, i + 1).flat().length)])
      const { alias, cutoff } = aliasTables({ size: rates.length, rowStart, rate: Float64Array.from(rates.flat()) })
      for (let i = 0; i < rates.length; i++) {
        for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
          expect(alias[arc] >= rowStart[i] && alias[arc] < rowStart[i + 1]).toBe(true)
          expect(cutoff[arc] >= 0 && cutoff[arc] <= 1).toBe(true)
        }
      }
    }),
    { seed: 12, numRuns: 300 },
  ))
