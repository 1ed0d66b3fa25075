import { describe, expect, test } from 'vitest'
import { StillmarkError } from '../../src/errors/stillmark-error.js'
import type { CompiledMeasure, Functional } from '../../src/model/model.js'
import { type Move, solveTable, valueByState } from './table-chain.js'

const average = (values: readonly number[]): Functional => ({ kind: 'average', value: valueByState(values) })

/** Two desks' queue with room for four: everyone who comes and everyone who goes, one each time unit; all shares 1/5. */
const even: Move[] = [0, 1, 2, 3].flatMap((k): Move[] => [
  [k, k + 1, 1],
  [k + 1, k, 1],
])

const measured = (measure: CompiledMeasure, moves: readonly Move[], size: number, start = 0) =>
  solveTable('continuous', size, moves, { measures: [measure], start }).answer.measures[measure.name] as {
    value: number
    errorBound: number
  }

describe('quantiles', () => {
  const quantile = (level: number, values = [0, 1, 2, 3, 4]): CompiledMeasure => ({
    name: 'q',
    kind: 'quantile',
    value: valueByState(values),
    level,
  })

  // All five shares are exactly 1/5, so a level of 3/5 is met exactly by the third value: decided in fractions.
  test.each([
    { level: 0.1, value: 0 },
    { level: 0.2, value: 0 },
    { level: 0.2000000001, value: 1 },
    { level: 0.6, value: 2 },
    { level: 0.6000000000000001, value: 3 },
    { level: 0.8, value: 3 },
    { level: 0.95, value: 4 },
  ])('the smallest value that level $level of the time is not above is $value', ({ level, value }) => {
    expect(measured(quantile(level), even, 5)).toEqual({ value, errorBound: 0 })
  })

  test('states of the same value count together', () => {
    expect(measured(quantile(0.7, [0, 7, 7, 7, 9]), even, 5).value).toBe(7)
  })

  test('a tie that fractions can’t settle is told by the bound', () => {
    // 400 states are beyond the fractions; the level is met within rounding by the 200th value.
    const n = 400
    const moves = Array.from({ length: n - 1 }, (_, k): Move[] => [
      [k, k + 1, 1 / 3],
      [k + 1, k, 1 / 3],
    ]).flat()
    const { value, errorBound } = measured(
      quantile(
        0.5,
        Array.from({ length: n }, (_, k) => k),
      ),
      moves,
      n,
    )
    expect(Math.abs(value - 199)).toBeLessThanOrEqual(errorBound)
    expect(errorBound).toBeLessThanOrEqual(1)
  })
})

describe('distributions', () => {
  test('give each value its share, ascending, states of the same value together', () => {
    const { answer } = solveTable('continuous', 5, even, {
      measures: [{ name: 'd', kind: 'distribution', value: valueByState([2, 0, 2, 0, 5]) }],
    })
    const { points, errorBound } = answer.measures.d as { points: [number, number][]; errorBound: number }
    expect(points.map(([value]) => value)).toEqual([0, 2, 5])
    points.forEach(([, share], k) => {
      expect(Math.abs(share - [0.4, 0.4, 0.2][k])).toBeLessThanOrEqual(errorBound + 2 ** -54)
    })
    expect(errorBound).toBeLessThan(1e-14)
  })

  test('of many values keep a true bound', () => {
    const n = 200
    const moves = Array.from({ length: n - 1 }, (_, k): Move[] => [
      [k, k + 1, 1],
      [k + 1, k, 2],
    ]).flat()
    const { answer } = solveTable('continuous', n, moves, {
      measures: [{ name: 'd', kind: 'distribution', value: valueByState(Array.from({ length: n }, (_, k) => k)) }],
    })
    const { points, errorBound } = answer.measures.d as { points: [number, number][]; errorBound: number }
    // Truncated geometric law, by hand; 1 - 2^-200 is 1 in doubles.
    points.forEach(([k, share]) => {
      expect(Math.abs(share - 2 ** -(k + 1))).toBeLessThanOrEqual(errorBound)
    })
    expect(errorBound).toBeLessThan(1e-11)
  })
})

describe('ratios', () => {
  const ratio = (top: Functional, bottom: Functional): CompiledMeasure => ({ name: 'r', kind: 'ratio', top, bottom })

  test('mean number over the rate of arrivals taken in is the mean time in the system, by Little', () => {
    // By hand: 2 present, arrivals 1 taken in 4/5 of the time: 2.5.
    const { value, errorBound } = measured(ratio(average([0, 1, 2, 3, 4]), average([1, 1, 1, 1, 0])), even, 5)
    expect(Math.abs(value - 2.5)).toBeLessThanOrEqual(errorBound)
    expect(errorBound).toBeLessThan(2e-14)
  })

  test('of a thing to itself is 1, with next to no error', () => {
    const { value, errorBound } = measured(ratio(average([0, 1, 2, 3, 4]), average([0, 1, 2, 3, 4])), even, 5)
    expect(value).toBe(1)
    expect(errorBound).toBeLessThan(1e-15)
  })

  test('of something that never happens is refused by name', () => {
    expect(() => measured(ratio(average([1, 1, 1, 1, 1]), average([0, 0, 0, 0, 0])), even, 5)).toThrow(
      'The ratio "r" divides by something that is 0 in the long run.',
    )
  })
})

test('moves of a table are counted by where they come from and go to', () => {
  const frequency = (from?: number, to?: number): CompiledMeasure => ({
    name: 'f',
    kind: 'frequency',
    of: { kind: 'moves', from, to },
  })
  const near = (measure: CompiledMeasure, expected: number) => {
    const { value, errorBound } = measured(measure, even, 5)
    expect(Math.abs(value - expected)).toBeLessThanOrEqual(errorBound)
  }
  near(frequency(0, 1), 0.2)
  near(frequency(1), 0.4)
  near(frequency(undefined, 4), 0.2)
  near(frequency(), 1.6)
})

describe('several closed classes', () => {
  // From 0 to {1, 2} three times in four, to {3} else; by hand: shares 1/2 and 1/4 in the first class, mean 10·1/3 + 20·2/3.
  const moves: Move[] = [
    [0, 1, 3],
    [0, 3, 1],
    [1, 2, 2],
    [2, 1, 1],
  ]
  const values = [999, 10, 20, 60]
  const { answer } = solveTable('continuous', 4, moves, {
    measures: [
      { name: 'mean', kind: 'average', of: average(values) },
      { name: 'median', kind: 'quantile', value: valueByState(values), level: 0.5 },
      { name: 'r', kind: 'ratio', top: average(values), bottom: average([0, 1, 0, 0]) },
    ],
  })

  test('are mixed by the probabilities of ending in them', () => {
    const { value, errorBound } = answer.measures.mean as { value: number; errorBound: number }
    expect(Math.abs(value - (0.75 * (50 / 3) + 0.25 * 60))).toBeLessThanOrEqual(errorBound + 4e-15)
    expect(errorBound).toBeLessThan(1e-12)
    const shares = answer.shares as Float64Array
    for (const [k, share] of [0, 0.25, 0.5, 0.25].entries()) expect(shares[k]).toBeCloseTo(share, 15)
    expect(answer.measures.median).toMatchObject({ value: 20 })
  })

  test('and answered one by one; a ratio is left out where its class has nothing below the line', () => {
    const [first, second] = answer.byClass ?? []
    expect((first.mean as { value: number }).value).toBeCloseTo(50 / 3, 13)
    expect(second.mean).toEqual({ value: 60, errorBound: expect.any(Number) })
    expect(Object.keys(first)).toContain('r')
    expect(Object.keys(second)).not.toContain('r')
  })
})

describe('refusals', () => {
  const faultOf = (run: () => unknown): StillmarkError => {
    try {
      run()
    } catch (error) {
      if (error instanceof StillmarkError) return error
      throw error
    }
    throw new Error('nothing was refused')
  }

  test('more memory than allowed, before it is taken', () => {
    const fault = faultOf(() => solveTable('continuous', 5, even, { maxMemoryBytes: 100 }))
    expect([fault.code, fault.kind]).toEqual(['memory-limit', 'limit'])
  })

  test('a value that is no number, with its state', () => {
    const fault = faultOf(() =>
      measured({ name: 'm', kind: 'average', of: average([0, 1, Number.NaN, 3, 4]) }, even, 5),
    )
    expect([fault.code, fault.where?.key]).toEqual(['value-not-finite', 'measures.m'])
    expect(fault.what).toContain('s2')
  })

  test('work after it was called off', () => {
    const controller = new AbortController()
    controller.abort()
    const fault = faultOf(() => solveTable('continuous', 5, even, { signal: controller.signal }))
    expect(fault.kind).toBe('interrupted')
  })
})
