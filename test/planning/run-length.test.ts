import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { estimateMean } from '../../src/estimation/batch-means.js'
import { studentTailQuantile } from '../../src/numbers/distributions.js'
import { chooseRunLength, type MeasureNeed, pleasantAbove, pleasantBelow } from '../../src/planning/run-length.js'
import { draws } from '../estimation/series.js'

const need = (more: Partial<MeasureNeed> = {}): MeasureNeed => ({
  name: 'full',
  varianceConstant: 4,
  tolerance: 0.1,
  correlationTime: 0,
  ...more,
})
const given = { replications: 16, confidence: 0.95, eventsPerTimeUnit: 1, maxEvents: 1e12, warmUp: 0 }

describe('what decides', () => {
  // Half-width t·√(4/(16·T))·1.15 = 0.05 with t = 2.1314 (15 degrees): T = 4/16·(2·2.1314·1.15/0.1)² = 600.8.
  test('the interval of a measure at half its tolerance', () => {
    const wanted = (4 / 16) * ((2 * studentTailQuantile(0.025, 15) * 1.15) / 0.1) ** 2
    expect(wanted).toBeCloseTo(600.8, 1)
    expect(chooseRunLength([need({ varianceConstant: 40 })], given)).toEqual({
      runLength: 8000, // 6008 and up
      basis: 'the interval of full should be half as wide as its tolerance',
    })
  })
  test('the neediest of several', () => {
    const needs = [need({ varianceConstant: 40 }), need({ name: 'busy', varianceConstant: 400 }), need()]
    expect(chooseRunLength(needs, given).basis).toMatch(/^the interval of busy/)
    expect(chooseRunLength(needs, given).runLength).toBe(80_000)
  })
  test('with few replications the interval rests on batches', () => {
    const wanted = (4 / 2) * ((2 * studentTailQuantile(0.025, 7) * 1.15) / 0.01) ** 2
    const { runLength } = chooseRunLength([need({ tolerance: 0.01 })], { ...given, replications: 2 })
    expect(runLength).toBe(pleasantAbove(wanted))
    const alone = chooseRunLength([need({ tolerance: 0.01 })], { ...given, replications: 1 })
    expect(alone.runLength).toBe(pleasantAbove(2 * wanted)) // 7 degrees of freedom too
  })
  test('fifty correlation times', () => {
    expect(chooseRunLength([need({ correlationTime: 100 })], given)).toEqual({
      runLength: 5000,
      basis: 'each replication should last 50 correlation times of full',
    })
  })
  test('fifty warm-ups', () => {
    expect(chooseRunLength([], { ...given, warmUp: 40 })).toEqual({ runLength: 2000, basis: 'fifty times the warm-up' })
  })
  test('a thousand firings where nothing else asks for more', () => {
    expect(chooseRunLength([], { ...given, eventsPerTimeUnit: 20 })).toEqual({
      runLength: 50,
      basis: 'a thousand firings a replication',
    })
    expect(chooseRunLength([need({ tolerance: 0 })], given).basis).toBe('a thousand firings a replication')
  })
  test('the budget, warm-up included, rounded down', () => {
    expect(chooseRunLength([need({ tolerance: 1e-6 })], { ...given, maxEvents: 1e6, warmUp: 500 })).toEqual({
      runLength: 60_000, // 62,500 less 500
      basis: 'at most 1,000,000 events in all',
    })
    const fast = { ...given, maxEvents: 1e6, eventsPerTimeUnit: 10 }
    expect(chooseRunLength([need({ tolerance: 1e-6 })], fast).runLength).toBe(6000)
  })
  test('a budget that the warm-up eats leaves a thousand firings', () => {
    expect(chooseRunLength([need()], { ...given, maxEvents: 16, warmUp: 500 }).runLength).toBe(1000)
  })
})

describe('pleasant numbers', () => {
  test.each([
    { value: 1, above: 1, below: 1 },
    { value: 1.01, above: 1.2, below: 1 },
    { value: 601, above: 800, below: 600 },
    { value: 9.5, above: 10, below: 8 },
    { value: 0.013, above: 0.015, below: 0.012 },
    { value: 120_000, above: 120_000, below: 120_000 },
    { value: 0.3, above: 0.3, below: 0.3 },
  ])('$value: $above above, $below below', ({ value, above, below }) => {
    expect(pleasantAbove(value)).toBe(above)
    expect(pleasantBelow(value)).toBe(below)
  })
  test('never on the wrong side, never off by more than a third', () =>
    fc.assert(
      fc.property(fc.double({ min: 1e-9, max: 1e12, noNaN: true }), (value) => {
        const above = pleasantAbove(value)
        const below = pleasantBelow(value)
        expect(above).toBeGreaterThanOrEqual(value * (1 - 1e-9))
        expect(below).toBeLessThanOrEqual(value * (1 + 1e-9))
        expect(above / value).toBeLessThan(1.34)
        expect(value / below).toBeLessThan(1.34)
      }),
      { seed: 7, numRuns: 2000 },
    ))
})

// A planned run reaches its half-width four times in five (chi-square, 15 degrees, 1.15²·15), more where it is rounded up,
// and the tolerance itself about always. 1,000 runs: below 740 is one chance in 10⁹ at 0.82.
test('a run as long as planned has the interval that was asked for', () => {
  const { normal } = draws('planned')
  const { runLength } = chooseRunLength([need({ varianceConstant: 40 })], given)
  let reached = 0
  for (let run = 0; run < 1000; run++) {
    const means = Float64Array.from({ length: 16 }, () => Math.sqrt(40 / runLength) * normal())
    const { halfWidth } = estimateMean(means, 16, 0.95)
    if (halfWidth! <= 0.05) reached++
    expect(halfWidth!).toBeLessThan(0.1)
  }
  expect(reached).toBeGreaterThan(740)
})
