import { describe, expect, test } from 'vitest'
import { estimateMean } from '../../src/estimation/batch-means.js'
import {
  distributionAtConfidence,
  estimateDistribution,
  estimateQuantile,
  type Histogram,
} from '../../src/estimation/quantile.js'
import { studentTail } from '../../src/numbers/distributions.js'
import { draws } from './series.js'

/** One row a replication. */
const histogram = (values: number[], rows: number[][]): Histogram => ({
  values: Float64Array.from(values),
  shares: Float64Array.from(rows.flat()),
  batches: 1,
})

// Four replications; shares up to 1, 2, 5 average 0.25, 0.6, 1. Deviations of the first two are 0.1 about their means.
const four = histogram(
  [1, 2, 5],
  [
    [0.15, 0.45, 0.4],
    [0.35, 0.15, 0.5],
    [0.35, 0.35, 0.3],
    [0.15, 0.45, 0.4],
  ],
)
const t3 = 3.182446305284263 // table 26.10 of Abramowitz and Stegun 1964 has 3.182

describe('estimate', () => {
  test.each([
    { level: 0.1, value: 1 },
    { level: 0.25, value: 1 },
    { level: 0.26, value: 2 },
    { level: 0.6, value: 2 },
    { level: 0.61, value: 5 },
    { level: 0.999, value: 5 },
  ])('the smallest value up to which a share of $level lies is $value', ({ level, value }) => {
    expect(estimateQuantile(four, 4, level, 0.95).estimate).toBe(value)
  })
  test('a share that misses the level by rounding reaches it', () => {
    const thirds = histogram([0, 1], Array(2).fill([1 / 3 + 1 / 3, 1 / 3]))
    expect(estimateQuantile(thirds, 2, 2 / 3 + 1e-16, 0.95).estimate).toBe(0)
    const off = estimateQuantile(thirds, 2, 2 / 3 + 1e-11, 0.95)
    expect(off.estimate).toBe(1)
  })
})

describe('interval', () => {
  const upTo = (v: number) =>
    estimateMean(
      Float64Array.from({ length: 4 }, (_, r) => four.shares.subarray(3 * r, 3 * r + v + 1).reduce((a, b) => a + b, 0)),
      4,
      0.95,
    )
  test('its ends are where the intervals of the shares cross the level', () => {
    const first = upTo(0)
    const second = upTo(1)
    expect(first.halfWidth).toBeCloseTo((t3 * Math.sqrt(0.04 / 3)) / 2, 12)
    const at = (level: number) => {
      const { low, high, halfWidth } = estimateQuantile(four, 4, level, 0.95)
      return { low, high, halfWidth }
    }
    // Up to 1 there may be as much as 0.25 + 0.184, up to 2 as little as 0.6 - 0.159.
    const most = first.estimate + first.halfWidth!
    const least = second.estimate - second.halfWidth!
    expect(most).toBeLessThan(least)
    expect(at(most - 1e-9)).toEqual({ low: 1, high: 2, halfWidth: 1 })
    expect(at(most + 1e-9)).toEqual({ low: 2, high: 2, halfWidth: 0 })
    expect(at(least - 1e-9)).toEqual({ low: 2, high: 2, halfWidth: 0 })
    expect(at(least + 1e-9)).toEqual({ low: 2, high: 5, halfWidth: 3 })
    expect(at(0.61)).toEqual({ low: 2, high: 5, halfWidth: 3 })
  })
  test('p-values: two-sided, of the share below the value against the level, or up to it', () => {
    const { pValueOf } = estimateQuantile(four, 4, 0.3, 0.95)
    const first = upTo(0)
    const tooFew = 2 * studentTail((0.3 - first.estimate) / first.standardError!, 3)
    expect(pValueOf(2)).toBe(1) // 0.25 below, 0.6 up to it: just what a quantile has
    expect(pValueOf(1)).toBeCloseTo(tooFew, 12)
    expect(pValueOf(1.5)).toBeCloseTo(tooFew, 12) // between values nothing more is reached
    const second = upTo(1)
    const tooMany = 2 * studentTail((second.estimate - 0.3) / second.standardError!, 3)
    expect(pValueOf(5)).toBeCloseTo(tooMany, 12)
    expect(pValueOf(0)).toBe(0) // nothing at all lies up to it
    // All lies below 9 in each of four replications: at a share of 0.3 chance does that with 0.3⁴ at most.
    expect(pValueOf(9)).toBeCloseTo(2 * 0.3 ** 4, 14)
  })
  test('one observation, or batches that hang together, have none', () => {
    const one = estimateQuantile(histogram([1, 2], [[0.5, 0.5]]), 1, 0.5, 0.95)
    expect(one).toMatchObject({ estimate: 1 })
    expect(one.halfWidth).toBeUndefined()
    expect(one.noInterval).toBe('one observation alone has no interval: run more replications')
    const climb: Histogram = {
      values: Float64Array.of(1, 2),
      shares: Float64Array.from({ length: 64 }, (_, i) => (i % 2 === 0 ? i / 64 : 1 - (i - 1) / 64)),
      batches: 32,
    }
    const lone = estimateQuantile(climb, 1, 0.9, 0.95)
    expect(lone.estimate).toBe(2)
    expect(lone.halfWidth).toBeUndefined()
    expect(lone.noInterval).toMatch(/hang together/)
    expect(estimateQuantile(climb, 1, 0.4, 0.95).halfWidth).toBeUndefined()
  })
  test('a value that never changes is known to width 0', () => {
    const always = histogram([7], Array(4).fill([1]))
    expect(estimateQuantile(always, 4, 0.5, 0.95)).toMatchObject({ estimate: 7, low: 7, high: 7, halfWidth: 0 })
  })
  test('it says what it rests on', () => {
    expect(estimateQuantile(four, 4, 0.5, 0.9)).toMatchObject({
      confidence: 0.9,
      method: 'turned interval of the share, replication means, 4 replications',
      batches: 4,
    })
  })
  test('it carries the test of the batches from which the share was decided', () => {
    const { uniform } = draws('carried')
    const first = Float64Array.from({ length: 64 }, uniform)
    const two: Histogram = {
      values: Float64Array.of(1, 2),
      shares: Float64Array.from({ length: 128 }, (_, i) => (i % 2 === 0 ? first[i / 2] : 1 - first[(i - 1) / 2])),
      batches: 32,
    }
    const found = estimateQuantile(two, 2, 0.2, 0.95)
    expect(found.batchTest).toBeDefined()
    expect(found.batchTest).toEqual(estimateMean(first, 2, 0.95).batchTest)
    expect('batchTest' in estimateQuantile(four, 4, 0.5, 0.95)).toBe(false)
    const { points } = estimateDistribution(two, 2, 0.95)
    expect(points[0]).toEqual(estimateMean(first, 2, 0.95))
  })
  test('a share that does not vary rules out what it misses, and what hangs together rules out nothing', () => {
    const steady = histogram([1, 2], Array(4).fill([0.25, 0.75]))
    const { pValueOf } = estimateQuantile(steady, 4, 0.5, 0.95)
    expect(pValueOf(1)).toBe(0)
    expect(pValueOf(2)).toBe(1)
    expect(estimateQuantile(steady, 4, 0.25, 0.95).pValueOf(1)).toBe(1) // the level is just reached
    const climb: Histogram = {
      values: Float64Array.of(1, 2),
      shares: Float64Array.from({ length: 64 }, (_, i) => (i % 2 === 0 ? i / 64 : 1 - (i - 1) / 64)),
      batches: 32,
    }
    expect(estimateQuantile(climb, 1, 0.9, 0.95).pValueOf(1)).toBe(1)
  })
  test('refused: a level of 0 or 1, nothing seen, NaN', () => {
    expect(() => estimateQuantile(four, 4, 0, 0.95)).toThrow('a level of 0')
    expect(() => estimateQuantile(four, 4, 1, 0.95)).toThrow('a level of 1')
    expect(() => estimateQuantile(histogram([], [[], []]), 2, 0.5, 0.95)).toThrow(
      expect.objectContaining({ code: 'too-few' }),
    )
    expect(() => estimateQuantile(histogram([1], [[Number.NaN], [1]]), 2, 0.5, 0.95)).toThrow(
      expect.objectContaining({ code: 'not-finite' }),
    )
  })
  // Sixteen replications of 200 draws of a die each; the median is 3, as just half the share lies up to it: the level is
  // hit exactly, the hardest case. 2,000 intervals of 95 %: 93 % or more in all but 1 of 20,000 tests where it is honest.
  test('the interval covers the true quantile', () => {
    const { uniform } = draws('die')
    for (const { level, truth } of [
      { level: 0.5, truth: 3 },
      { level: 0.6, truth: 4 },
    ]) {
      let hits = 0
      for (let run = 0; run < 2000; run++) {
        const rows = Array.from({ length: 16 }, () => {
          const row = [0, 0, 0, 0, 0, 0]
          for (let k = 0; k < 200; k++) row[Math.ceil(6 * uniform()) - 1] += 1 / 200
          return row
        })
        const { low, high } = estimateQuantile(histogram([1, 2, 3, 4, 5, 6], rows), 16, level, 0.95)
        if (low! <= truth && truth <= high!) hits++
      }
      expect(hits).toBeGreaterThan(1860)
    }
  })
})

describe('distribution', () => {
  test('each value on its own', () => {
    const found = estimateDistribution(four, 4, 0.95)
    expect(found.method).toBe('replication means, 4 replications, each value on its own')
    expect(found.confidence).toBe(0.95)
    expect([...found.values]).toEqual([1, 2, 5])
    expect(found.points).toHaveLength(3)
    expect(found.points[2]).toEqual(estimateMean(Float64Array.of(0.4, 0.5, 0.3, 0.4), 4, 0.95))
    expect(found.points.reduce((sum, { estimate }) => sum + estimate, 0)).toBeCloseTo(1, 14)
  })
  test('at another confidence all points change', () => {
    const found = estimateDistribution(four, 4, 0.95)
    const wider = distributionAtConfidence(found, 0.99)
    expect(wider.confidence).toBe(0.99)
    for (const [i, point] of wider.points.entries()) {
      expect(point.confidence).toBe(0.99)
      expect(point.halfWidth! / found.points[i].halfWidth!).toBeCloseTo(5.840909309733355 / t3, 12) // t, 3 degrees
    }
  })
  test('nothing seen', () => {
    expect(estimateDistribution(histogram([], []), 4, 0.95)).toMatchObject({
      method: 'nothing seen, each value on its own',
      points: [],
    })
  })
})
