import { describe, expect, test } from 'vitest'
import { type ClaimToJudge, judgeClaim } from '../../src/comparison/compare-claim.js'
import type { Estimate } from '../../src/estimation/estimate.js'

const claim = (value: number, more: Partial<ClaimToJudge> = {}): ClaimToJudge => ({
  measure: 'full',
  value,
  written: String(value),
  lastDigit: 0,
  ...more,
})
const exactly = (value: number, errorBound = 0) => ({ value, errorBound })
const absolute = (value: number) => ({ tolerance: { kind: 'absolute', value } as const })
const simulated = (estimate: number, halfWidth?: number): Estimate => ({
  estimate,
  confidence: 0.95,
  method: '',
  ...(halfWidth === undefined ? {} : { halfWidth }),
})

describe('against the exact value', () => {
  test.each([
    { value: 8, verdict: 'agrees' },
    { value: 10, verdict: 'agrees' },
    { value: 6, verdict: 'agrees' },
    { value: 10.0001, verdict: 'disagrees' },
    { value: 5.9999, verdict: 'disagrees' },
  ])('8 ± 2: $value $verdict', ({ value, verdict }) => {
    expect(judgeClaim(claim(value, absolute(2)), exactly(8), undefined)).toEqual({
      verdict,
      claimed: value,
      exact: 8,
      tolerance: expect.closeTo(2, 12),
    })
  })
  test('a percentage is of the exact value, not of the claim', () => {
    const tolerance = { tolerance: { kind: 'relative', value: 0.25 } as const }
    expect(judgeClaim(claim(10, tolerance), exactly(8), undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(10.25, tolerance), exactly(8), undefined).verdict).toBe('disagrees') // 2.56 of the claim
  })
  test('3 % off is caught at 2 %, and a claim rounded to its digits is right', () => {
    const exact = exactly(0.1146891553232119, 1e-16) // Erlang's loss formula, 24 places, 22.5 erlangs
    const twoPercent = { tolerance: { kind: 'relative', value: 0.02 } as const }
    expect(judgeClaim(claim(0.1146891553232119 * 1.03, twoPercent), exact, undefined).verdict).toBe('disagrees')
    expect(judgeClaim(claim(0.115, { lastDigit: 0.001 }), exact, undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(0.1147, { lastDigit: 0.0001 }), exact, undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(0.114, { lastDigit: 0.001 }), exact, undefined)).toMatchObject({
      verdict: 'disagrees',
      tolerance: expect.closeTo(0.0005, 15),
    })
  })
  test('half a unit of the last digit, to the border', () => {
    expect(judgeClaim(claim(8, { lastDigit: 1 }), exactly(8.5), undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(8, { lastDigit: 1 }), exactly(8.500001), undefined).verdict).toBe('disagrees')
  })
  test('a fraction is held to its double', () => {
    expect(judgeClaim(claim(1 / 3), exactly(1 / 3, 1e-17), undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(1 / 3), exactly(1 / 3 + 1e-14, 1e-13), undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(1 / 3), exactly(0.3334, 1e-13), undefined).verdict).toBe('disagrees')
  })
  test('on the border, within an error bound that is not negligible, nobody can say', () => {
    expect(judgeClaim(claim(10, absolute(2)), exactly(8, 0.5), undefined).verdict).toBe('undecided')
    expect(judgeClaim(claim(9.5, absolute(2)), exactly(8, 0.5), undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(10.5, absolute(2)), exactly(8, 0.5), undefined).verdict).toBe('undecided')
    expect(judgeClaim(claim(10.75, absolute(2)), exactly(8, 0.5), undefined).verdict).toBe('disagrees')
    expect(judgeClaim(claim(10, absolute(2)), exactly(8, 8e-9), undefined).verdict).toBe('agrees')
    expect(judgeClaim(claim(10, absolute(2)), exactly(8, 8.1e-9), undefined).verdict).toBe('undecided')
  })
  test('it keeps where it came from', () => {
    expect(judgeClaim(claim(8, { source: 'sheet 3' }), exactly(8), undefined).source).toBe('sheet 3')
    expect('source' in judgeClaim(claim(8), exactly(8), undefined)).toBe(false)
  })
})

describe('against the simulation, where there is no exact value', () => {
  test.each([
    { value: 8.5, halfWidth: 1.5, verdict: 'agrees' },
    { value: 7.5, halfWidth: 1.5, verdict: 'agrees' },
    { value: 8.5, halfWidth: 1.75, verdict: 'undecided' },
    { value: 11, halfWidth: 0.5, verdict: 'disagrees' },
    { value: 5, halfWidth: 0.5, verdict: 'disagrees' },
    { value: 11, halfWidth: 1.25, verdict: 'undecided' },
    { value: 11, halfWidth: 1, verdict: 'undecided' },
  ])('8 ± $halfWidth simulated, 2 allowed, $value claimed: $verdict', ({ value, halfWidth, verdict }) => {
    expect(judgeClaim(claim(value, absolute(2)), undefined, simulated(8, halfWidth))).toMatchObject({
      verdict,
      exact: null,
      tolerance: expect.closeTo(2, 12),
    })
  })
  test('without an interval, an estimate, or a number: undecided', () => {
    expect(judgeClaim(claim(8, absolute(2)), undefined, simulated(8)).verdict).toBe('undecided')
    const tolerance = { tolerance: { kind: 'relative', value: 0.25 } as const }
    expect(judgeClaim(claim(8, tolerance), undefined, undefined)).toMatchObject({
      verdict: 'undecided',
      exact: null,
      tolerance: expect.closeTo(2, 12),
    })
    const distribution = { confidence: 0.95, method: '', values: new Float64Array(0), points: [] }
    expect(judgeClaim(claim(8, tolerance), undefined, distribution).verdict).toBe('undecided')
    expect(judgeClaim(claim(8, tolerance), { points: [], errorBound: 0 }, distribution).verdict).toBe('undecided')
  })
  test('a percentage is then of the estimate', () => {
    const tolerance = { tolerance: { kind: 'relative', value: 0.25 } as const }
    expect(judgeClaim(claim(10, tolerance), undefined, simulated(8, 0.25)).tolerance).toBeCloseTo(2, 12)
  })
})
