import { readFileSync } from 'node:fs'
import { expect, test } from 'vitest'
import { firstPassageDown, multiply } from '../../src/stationary/cyclic-reduction.js'
import {
  factorise,
  solveColumns,
  solveFromLeftInPlace,
  solveInPlace,
} from '../../src/stationary/cyclic-reduction-elimination.js'

test('one phase: the way down is certain below load 1, and its probability beyond', () => {
  const passage = (up: number, down: number) =>
    firstPassageDown({ size: 1, up: Float64Array.of(up), local: Float64Array.of(0), down: Float64Array.of(down) })[0]
  expect(passage(0.9, 1)).toBeCloseTo(1, 15)
  expect(Math.abs(passage(1 - 2 ** -30, 1) - 1)).toBeLessThan(1e-14)
  expect(Math.abs(passage(4, 1) - 1 / 4)).toBeLessThan(1e-15) // gambler's ruin
})

test('G of two phases, published (Neuts 1981 form, matrix-geometric.json, mmpp2-m-1)', () => {
  const passage = firstPassageDown({
    size: 2,
    up: Float64Array.of(1.8, 0, 0, 0.2),
    local: Float64Array.of(0, 0.1, 0.2, 0),
    down: Float64Array.of(2, 0, 0, 2),
  })
  const cases = JSON.parse(readFileSync('test/published/references/matrix-geometric.json', 'utf8')).cases
  const { values } = cases.find(({ id }: { id: string }) => id === 'mmpp2-m-1')
  for (const [k, each] of [...values.G_row0, ...values.G_row1].entries()) {
    expect(Math.abs(passage[k] / Number(each) - 1)).toBeLessThan(4e-15)
  }
})

test('what is factorised solves from both sides, also where rows hardly leave', () => {
  const m = 4
  const beside = Float64Array.of(0, 1, 2, 0.5, 3, 0, 1, 1, 0.25, 1, 0, 2, 1, 1, 1, 0)
  const excess = Float64Array.of(1e-12, 0, 0, 1e-13)
  const factors = factorise(beside, excess, m)
  // M 1 = excess, so M^-1 excess = 1 without loss.
  const ones = excess.slice()
  solveInPlace(factors, ones)
  for (const each of ones) expect(Math.abs(each - 1)).toBeLessThan(1e-15)
  const row = Float64Array.of(1, 2, 3, 4)
  const left = row.slice()
  solveFromLeftInPlace(factors, left)
  // (row M^-1) excess = row 1 = 10.
  expect(Math.abs(left.reduce((sum, each, k) => sum + each * excess[k], 0) / 10 - 1)).toBeLessThan(1e-15)
  const identity = Float64Array.from({ length: 16 }, (_, k) => (k % 5 === 0 ? 1 : 0))
  const inverse = solveColumns(factors, identity)
  const column = Float64Array.of(0, 1, 0, 0)
  solveInPlace(factors, column)
  column.forEach((each, i) => {
    expect(inverse[i * m + 1]).toBe(each)
  })
  expect(multiply(identity, inverse, m)).toEqual(inverse)
})
