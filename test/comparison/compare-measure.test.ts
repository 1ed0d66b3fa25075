import { describe, expect, test } from 'vitest'
import { judgeMeasure, type Prediction, toleranceOf } from '../../src/comparison/compare-measure.js'
import { estimateMean, halfWidthOf } from '../../src/estimation/batch-means.js'
import type { Estimate } from '../../src/estimation/estimate.js'
import { estimateQuantile } from '../../src/estimation/quantile.js'
import { draws } from '../estimation/series.js'

/** With a given half-width at 95 % and 15 degrees of freedom. */
const found = (estimate: number, halfWidth: number, more: Partial<Estimate> = {}): Estimate => ({
  estimate,
  halfWidth,
  standardError: halfWidth / 2.1314495455597755,
  degreesOfFreedom: 15,
  confidence: 0.95,
  method: 'replication means, 16 replications',
  ...more,
})
const exactly = (value: number, errorBound = 0) => ({ value, errorBound })
const absolute = (value: number) => ({ kind: 'absolute', value }) as const
const percent = (value: number) => ({ kind: 'relative', value: value / 100 }) as const
const predicted = (more: Partial<Prediction> = {}): Prediction => ({
  halfWidth: 1,
  correlationTime: 1,
  slow: false,
  ...more,
})

describe('visible and mattering are two things', () => {
  // Exact value 8, tolerance 2, all exactly representable: equality stands on the side named.
  test.each([
    { estimate: 8.5, halfWidth: 1, verdict: 'agrees', reason: 'inside' },
    { estimate: 9, halfWidth: 1, verdict: 'agrees', reason: 'inside' }, // the interval just reaches both 8 and 10
    { estimate: 7, halfWidth: 1, verdict: 'agrees', reason: 'inside' },
    { estimate: 9.25, halfWidth: 0.5, verdict: 'agrees', reason: 'harmless' },
    { estimate: 6.75, halfWidth: 0.5, verdict: 'agrees', reason: 'harmless' },
    { estimate: 8, halfWidth: 2, verdict: 'agrees', reason: 'inside' },
    { estimate: 8, halfWidth: 2.25, verdict: 'undecided', reason: 'too wide' },
    { estimate: 9.5, halfWidth: 1, verdict: 'undecided', reason: 'too wide' }, // visible, but may matter or not
    { estimate: 6.5, halfWidth: 1, verdict: 'undecided', reason: 'too wide' },
    { estimate: 11, halfWidth: 3, verdict: 'undecided', reason: 'too wide' }, // large, but 8 is not excluded
    { estimate: 5, halfWidth: 3, verdict: 'undecided', reason: 'too wide' },
    { estimate: 10, halfWidth: 1, verdict: 'undecided', reason: 'too wide' }, // a difference of just the tolerance
    { estimate: 10.25, halfWidth: 2, verdict: 'disagrees', reason: 'off' },
    { estimate: 5.75, halfWidth: 2, verdict: 'disagrees', reason: 'off' },
    { estimate: 20, halfWidth: 1, verdict: 'disagrees', reason: 'off' },
  ])('8 ± 2 allowed, $estimate ± $halfWidth simulated: $verdict, $reason', (each) => {
    const judged = judgeMeasure(exactly(8), found(each.estimate, each.halfWidth), absolute(2), undefined)
    expect(judged).toMatchObject({
      verdict: each.verdict,
      reason: each.reason,
      difference: each.estimate - 8,
      tolerance: 2,
      exact: 8,
      estimate: each.estimate,
      adjustedHalfWidth: each.halfWidth,
    })
  })
  test('a percentage is of the exact value', () => {
    expect(toleranceOf(8, percent(25))).toBe(2)
    expect(toleranceOf(-8, percent(25))).toBe(2)
    expect(toleranceOf(8, absolute(0.5))).toBe(0.5)
    expect(judgeMeasure(exactly(-8), found(-9.25, 0.5), percent(25), undefined)).toMatchObject({
      verdict: 'agrees',
      reason: 'harmless',
      tolerance: 2,
    })
  })
  test('the p-value is two-sided, by Student: 5 % at one half-width of 95 %', () => {
    expect(judgeMeasure(exactly(8), found(9, 1), absolute(2), undefined).pValue).toBeCloseTo(0.05, 12)
    expect(judgeMeasure(exactly(8), found(7, 1), absolute(2), undefined).pValue).toBeCloseTo(0.05, 12)
    expect(judgeMeasure(exactly(8), found(8, 1), absolute(2), undefined).pValue).toBe(1)
  })
  test('the exact value is only known to its error bound: within it nothing is visible', () => {
    expect(judgeMeasure(exactly(8, 0.5), found(10.5, 2), absolute(2), undefined).reason).toBe('too wide')
    expect(judgeMeasure(exactly(8, 0.25), found(10.5, 2), absolute(2), undefined).reason).toBe('off')
    expect(judgeMeasure(exactly(8, 0.5), found(5.5, 2), absolute(2), undefined).reason).toBe('too wide')
    expect(judgeMeasure(exactly(8, 0.25), found(5.5, 2), absolute(2), undefined).reason).toBe('off')
  })
})

describe('no spread', () => {
  const constant = (estimate: number) => estimateMean(new Float64Array(16).fill(estimate), 16, 0.95)
  test('the same number agrees, also where no interval can be given', () => {
    expect(judgeMeasure(exactly(0), constant(0), percent(2), undefined)).toMatchObject({
      verdict: 'agrees',
      reason: 'same',
      pValue: 1,
    })
    expect(judgeMeasure(exactly(2.5), constant(2.5 + 2e-12), percent(2), undefined).reason).toBe('same')
    expect(judgeMeasure(exactly(2.5, 1e-9), constant(2.5 + 9e-10), absolute(0), undefined).reason).toBe('same')
    expect(judgeMeasure(exactly(2.5), constant(2.5 + 1e-11), absolute(0), undefined).reason).toBe('off')
  })
  test('where the run ends in a round is no difference to speak of', () => {
    expect(judgeMeasure(exactly(1 / 3), constant(0.333335), percent(1), undefined)).toMatchObject({
      verdict: 'agrees',
      reason: 'inside',
      adjustedHalfWidth: 0,
      pValue: 0,
    })
  })
  test('another number that matters disagrees', () => {
    expect(judgeMeasure(exactly(0.5), constant(0.25), percent(1), undefined)).toMatchObject({
      reason: 'off',
      pValue: 0,
    })
  })
  test('what was never seen is undecided, not equal', () => {
    const judged = judgeMeasure(exactly(1e-9), constant(0), percent(2), undefined)
    expect(judged).toMatchObject({ verdict: 'undecided', reason: 'no interval', pValue: 1 })
    expect('adjustedHalfWidth' in judged).toBe(false)
  })
})

describe('an exact value of 0', () => {
  test('a percentage of it allows nothing: no verdict unless 0 is excluded', () => {
    expect(judgeMeasure(exactly(0), found(0.5, 1), percent(2), undefined)).toMatchObject({
      verdict: 'undecided',
      reason: 'no percentage',
    })
    expect(judgeMeasure(exactly(1e-17, 1e-16), found(0.5, 1), percent(2), undefined).reason).toBe('no percentage')
    expect(judgeMeasure(exactly(0), found(2, 1), percent(2), undefined).reason).toBe('off')
  })
  test('a plain number decides as ever', () => {
    expect(judgeMeasure(exactly(0), found(0.5, 1), absolute(2), undefined).reason).toBe('inside')
    expect(judgeMeasure(exactly(0), found(0.5, 1), absolute(1), undefined).reason).toBe('too wide')
  })
})

describe('what theory says of the run', () => {
  test('an interval far narrower than the exact one is not believed', () => {
    // 15 degrees of freedom: a spread of a quarter of the true one has probability 1e-7, half of it 0.8 %.
    const judge = (halfWidth: number) =>
      judgeMeasure(exactly(8), found(8.5, halfWidth), absolute(1), predicted({ halfWidth: 2 }))
    expect(judge(0.5)).toMatchObject({ verdict: 'undecided', reason: 'interval too narrow' })
    expect(judge(0.75).reason).toBe('interval too narrow')
    expect(judge(1).reason).toBe('too wide') // half: chance does that
    expect(judge(1.2).reason).toBe('too wide')
  })
  test('at many degrees of freedom 0.6 of it is still chance enough', () => {
    const judge = (halfWidth: number) =>
      judgeMeasure(
        exactly(8),
        found(8, halfWidth, { degreesOfFreedom: 500 }),
        absolute(1.5),
        predicted({ halfWidth: 2 }),
      ).reason
    expect(judge(1.2)).toBe('inside')
    expect(judge(1.19)).toBe('interval too narrow')
  })
  test('a narrow interval does no harm where the exact one agrees too', () => {
    expect(judgeMeasure(exactly(8), found(8.5, 0.01), absolute(1), predicted({ halfWidth: 0.5 })).reason).toBe(
      'harmless',
    )
    expect(judgeMeasure(exactly(8), found(8.5, 0.01), absolute(1), predicted({ halfWidth: 0.625 })).reason).toBe(
      'interval too narrow',
    )
  })
  test('a spread small by luck does not condemn: the exact one must exclude the value too', () => {
    const judge = (halfWidth: number) => judgeMeasure(exactly(8), found(11, 2), absolute(2), predicted({ halfWidth }))
    expect(judge(3)).toMatchObject({ verdict: 'undecided', reason: 'too wide' })
    expect(judge(2.875)).toMatchObject({ verdict: 'disagrees', reason: 'off' })
  })
  test('a difference that the bias of the start explains is not held against the simulation', () => {
    const judge = (bias: number, tolerance = 2) =>
      judgeMeasure(exactly(8), found(11, 1), absolute(tolerance), predicted({ bias })).reason
    expect(judge(2)).toBe('bias left') // 3 - 2 is just within the half-width
    expect(judge(4)).toBe('bias left')
    expect(judge(1.75)).toBe('off')
    expect(judge(4.25)).toBe('off')
    expect(judge(-3)).toBe('off')
    expect(
      judgeMeasure(exactly(8), found(8.5, 0.25), absolute(0.25), predicted({ bias: 0.25, halfWidth: 0.2 })).reason,
    ).toBe('bias left')
    // A bias of a quarter of the tolerance is no excuse.
    expect(judgeMeasure(exactly(8), found(11, 2.5), absolute(2), predicted({ bias: 0.5 })).reason).toBe('off')
    expect(judgeMeasure(exactly(8), found(11, 2.5), absolute(2), predicted({ bias: 0.5625 })).reason).toBe('bias left')
  })
  test('a harmless difference that the bias explains is none', () => {
    expect(judgeMeasure(exactly(8), found(9.25, 0.5), absolute(2), predicted({ bias: 1, halfWidth: 0.5 })).reason).toBe(
      'inside',
    )
    expect(
      judgeMeasure(exactly(8), found(9.25, 0.5), absolute(2), predicted({ bias: 0.5, halfWidth: 0.5 })).reason,
    ).toBe('harmless')
  })
  test('too few independent looks: a difference is not held against it, agreement stands', () => {
    expect(judgeMeasure(exactly(8), found(11, 2), absolute(2), predicted({ slow: true }))).toMatchObject({
      verdict: 'undecided',
      reason: 'slow',
    })
    expect(judgeMeasure(exactly(8), found(8, 1), absolute(2), predicted({ slow: true })).verdict).toBe('agrees')
  })
})

describe('quantiles', () => {
  const rows = [
    [0.15, 0.45, 0.4],
    [0.35, 0.15, 0.5],
    [0.35, 0.35, 0.3],
    [0.15, 0.45, 0.4],
  ]
  const quantile = (level: number) =>
    estimateQuantile(
      { values: Float64Array.of(1, 2, 5), shares: Float64Array.from(rows.flat()), batches: 1 },
      4,
      level,
      0.95,
    )
  test('an interval that holds one value decides, one that holds two does not', () => {
    expect(judgeMeasure(exactly(2), quantile(0.44), percent(2), undefined)).toMatchObject({
      verdict: 'agrees',
      reason: 'same',
    })
    expect(judgeMeasure(exactly(2), quantile(0.3), percent(2), undefined)).toMatchObject({
      verdict: 'undecided',
      reason: 'too wide',
    })
    expect(judgeMeasure(exactly(5), quantile(0.44), percent(2), undefined)).toMatchObject({
      verdict: 'disagrees',
      pValue: quantile(0.44).pValueOf(5),
    })
    expect(judgeMeasure(exactly(1), quantile(0.44), absolute(1), undefined)).toMatchObject({
      verdict: 'agrees',
      reason: 'harmless',
    })
  })
  test('the sides of the interval count, not its half-width', () => {
    // From 1 to 2 around 2: the half-width of 1 would reach up to 3.
    expect(quantile(0.3)).toMatchObject({ estimate: 2, low: 1, high: 2, halfWidth: 1 })
    expect(judgeMeasure(exactly(1.5), quantile(0.3), absolute(0.5), undefined).reason).toBe('inside')
  })
})

test('a distribution and a number are not compared', () => {
  expect(() => judgeMeasure({ points: [], errorBound: 0 }, found(1, 1), absolute(1), undefined)).toThrow(
    'a distribution is compared with a distribution',
  )
})

// Twenty measures, independent, simulated rightly, each at 1 - 0.05/20: some exact value is excluded in at most 5 % of the
// runs. 2,000 runs: 61 to 139 in all but 1 of 15,000 tests where it is just 5 %.
test('twenty right measures are excluded no more often than stated', () => {
  const { normal } = draws('false alarms')
  let flagged = 0
  for (let run = 0; run < 2000; run++) {
    let seen = false
    for (let k = 0; k < 20; k++) {
      const estimate = estimateMean(Float64Array.from({ length: 16 }, normal), 16, 1 - 0.05 / 20)
      if (judgeMeasure(exactly(0), estimate, absolute(0), undefined).verdict === 'disagrees') seen = true
    }
    if (seen) flagged++
  }
  expect(flagged).toBeGreaterThan(61)
  expect(flagged).toBeLessThan(139)
})

// A rate that is 5 % off moves a mean by 5 %; with half-widths of 1 %, half the tolerance, 200 of 200 are caught.
test('a difference of 5 % is caught where 2 % matters and the interval is as planned', () => {
  const { normal } = draws('power')
  for (let run = 0; run < 200; run++) {
    const deviation = 0.01 * (4 / halfWidthOf(1, 15, 0.95))
    const values = Float64Array.from({ length: 16 }, () => 1.05 + deviation * normal())
    expect(judgeMeasure(exactly(1), estimateMean(values, 16, 0.95), percent(2), undefined).verdict).toBe('disagrees')
  }
})
