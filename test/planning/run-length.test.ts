import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { chooseRunLength, type MeasureNeed, pleasantAbove, pleasantBelow } from '../../src/planning/run-length.js'

const given = { replications: 16, confidence: 0.95, eventsPerTimeUnit: 10, maxEvents: 1e9, warmUp: 0 }
const need = (rest: Partial<MeasureNeed> = {}): MeasureNeed => ({
  name: 'present',
  varianceConstant: 0,
  tolerance: 1,
  correlationTime: 0,
  ...rest,
})

describe('what decides the run length', () => {
  test('an interval half as wide as the tolerance: (V/R) (2 z 1.3 / tolerance)²', () => {
    // 1.95996 is the normal's two-sided 95 % point. 160/16 · (2 · 1.95996 · 1.3 / 0.1)² = 25,968.
    expect(chooseRunLength([need({ varianceConstant: 160, tolerance: 0.1 })], given)).toEqual({
      runLength: 30_000,
      basis: 'the interval of present should be half as wide as its tolerance',
    })
  })
  // Just below 25,968 fifty times the warm-up does not decide yet, just above it does.
  test.each([
    { warmUp: 519, basis: 'the interval of present should be half as wide as its tolerance', runLength: 30_000 },
    { warmUp: 520, basis: 'fifty times the warm-up', runLength: 30_000 },
    { warmUp: 700, basis: 'fifty times the warm-up', runLength: 40_000 },
  ])('a warm-up of $warmUp: $basis', ({ warmUp, basis, runLength }) => {
    const found = chooseRunLength([need({ varianceConstant: 160, tolerance: 0.1 })], { ...given, warmUp })
    expect(found).toEqual({ runLength, basis })
  })
  test('fifty correlation times, of the slowest measure', () => {
    const needs = [need({ name: 'fast', correlationTime: 10 }), need({ name: 'slow', correlationTime: 40 }), need()]
    expect(chooseRunLength(needs, given)).toEqual({
      runLength: 2000,
      basis: 'each replication should last 50 correlation times of slow',
    })
    expect(chooseRunLength(needs, { ...given, warmUp: 40 }).basis).toBe('fifty times the warm-up')
  })
  test('a tolerance of 0 asks for nothing', () => {
    expect(chooseRunLength([need({ varianceConstant: 160, tolerance: 0 })], given).basis).toBe(
      'a thousand firings a replication',
    )
  })
  test('a thousand firings a replication at least', () => {
    expect(chooseRunLength([], given)).toEqual({ runLength: 100, basis: 'a thousand firings a replication' })
    const at = (correlationTime: number) => chooseRunLength([need({ correlationTime })], given).basis
    expect(at(2)).toBe('a thousand firings a replication')
    expect(at(2.01)).toBe('each replication should last 50 correlation times of present')
  })
  test('where next to nothing fires, the run stays finite', () => {
    const { runLength } = chooseRunLength([], { ...given, eventsPerTimeUnit: 0 })
    expect(Number.isFinite(runLength)).toBe(true)
  })
  test('the budget of events, warm-up included, rounded down', () => {
    const needs = [need({ varianceConstant: 160, tolerance: 0.01 })]
    // 1.6e6 events are 10,000 time units in each of 16 replications.
    expect(chooseRunLength(needs, { ...given, maxEvents: 1.6e6 })).toEqual({
      runLength: 10_000,
      basis: 'at most 1,600,000 events in all',
    })
    expect(chooseRunLength(needs, { ...given, maxEvents: 1.6e6, warmUp: 100 }).runLength).toBe(8000)
    // It is never so small that nothing happens.
    expect(chooseRunLength(needs, { ...given, maxEvents: 160 }).runLength).toBe(100)
  })
  test('four times the variance, a quarter of the replications or half the tolerance ask for four times the length', () => {
    const at = (varianceConstant: number, tolerance: number, replications: number) =>
      chooseRunLength([need({ varianceConstant, tolerance })], { ...given, replications, maxEvents: 1e15 }).runLength
    expect(at(640, 0.1, 16)).toBe(120_000) // 103,870
    expect(at(160, 0.05, 16)).toBe(120_000)
    expect(at(160, 0.1, 4)).toBe(120_000)
  })
  test('99 % asks for more than 95 %', () => {
    const at = (confidence: number) =>
      chooseRunLength([need({ varianceConstant: 160, tolerance: 0.1 })], { ...given, confidence }).runLength
    expect(at(0.99)).toBe(50_000) // 25,968 · (2.5758/1.95996)² = 44,851
  })
})

describe('pleasant numbers', () => {
  test.each([
    [1, 1, 1],
    [1.01, 1.2, 1],
    [1.3, 1.5, 1.2],
    [1.7, 2, 1.5],
    [2.1, 2.5, 2],
    [2.6, 3, 2.5],
    [3.5, 4, 3],
    [4.5, 5, 4],
    [5.5, 6, 5],
    [7, 8, 6],
    [9, 10, 8],
    [99, 100, 80],
    [1234, 1500, 1200],
    [0.0034, 0.004, 0.003],
    [1000, 1000, 1000],
    [0.3, 0.3, 0.3], // 3 tenths are not exactly 0.3
    [0.1 + 0.2, 0.3, 0.3],
    [6e22, 6e22, 6e22],
  ])('%d lies between %d above and %d below', (value, above, below) => {
    expect(pleasantAbove(value)).toBe(above)
    expect(pleasantBelow(value)).toBe(below)
  })
  test('the one above is never less, the one below never more, and neither is off by more than a third', () =>
    fc.assert(
      fc.property(fc.double({ min: -12, max: 12, noNaN: true }), (log) => {
        const value = 10 ** log
        const up = pleasantAbove(value) / value
        const down = pleasantBelow(value) / value
        expect(up).toBeGreaterThan(1 - 1e-11)
        expect(up).toBeLessThan(1.34)
        expect(down).toBeLessThan(1 + 1e-11)
        expect(down).toBeGreaterThan(0.74)
      }),
      { seed: 7, numRuns: 1000 },
    ))
})
