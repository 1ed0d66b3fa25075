import { describe, expect, test } from 'vitest'
import { judgeMeasure } from '../../src/comparison/compare-measure.js'
import type { Estimate } from '../../src/estimation/estimate.js'
import type { DistributionEstimate } from '../../src/estimation/quantile.js'

// Numbers are sums of powers of two, so that "exactly at the border" means it.
const tiny = 2 ** -20
const estimated = (estimate: number, halfWidth?: number, rest: Partial<Estimate> = {}): Estimate => ({
  estimate,
  ...(halfWidth === undefined ? { noInterval: 'too few' } : { halfWidth }),
  confidence: 0.95,
  method: 'replication means, 16 replications',
  ...rest,
})

describe('a distribution', () => {
  const level = 0.05
  const distribution = (
    points: readonly [value: number, Estimate][],
    confidence = 1 - level,
  ): DistributionEstimate => ({
    confidence,
    method: '',
    values: Float64Array.from(points, ([value]) => value),
    points: points.map(([, point]) => point),
  })
  const point = (estimate: number, halfWidth?: number, rest: Partial<Estimate> = {}): Estimate =>
    estimated(estimate, halfWidth, {
      batches: 16,
      ...(halfWidth === undefined ? {} : { standardError: halfWidth / 2.1314495455597755, degreesOfFreedom: 15 }),
      ...rest,
    })
  const quarter = { kind: 'absolute', value: 0.25 } as const
  const exact = {
    points: [
      [0, 0.5],
      [1, 0.25],
      [2, 0.25],
    ] as const,
    errorBound: 0,
  }
  const judge = (seen: DistributionEstimate, allowed: number = quarter.value, errorBound = 0) =>
    judgeMeasure({ ...exact, errorBound }, seen, { kind: 'relative', value: allowed }, undefined)

  test('every share within the tolerance with its interval: agrees, and the one that reaches farthest is told', () => {
    const judged = judge(
      distribution([
        [0, point(0.5, 0.125)],
        [1, point(0.125, 0.125)],
        [2, point(0.375, 0.0625)],
      ]),
    )
    expect(judged).toMatchObject({
      verdict: 'agrees',
      difference: -0.125,
      tolerance: 0.25,
      exact: 0.25,
      estimate: 0.125,
      adjustedHalfWidth: 0.125,
    })
  })
  test('one that reaches beyond leaves it undecided', () => {
    const judged = judge(
      distribution([
        [0, point(0.5, 0.25 + tiny)],
        [1, point(0.25, 0.125)],
        [2, point(0.25, 0.125)],
      ]),
    )
    expect(judged).toMatchObject({ verdict: 'undecided', reason: 'too wide', adjustedHalfWidth: 0.25 + tiny })
  })
  test('differences that can be seen and do not matter are harmless, others are no news', () => {
    const shares = (at: number, halfWidth: number) =>
      distribution([
        [0, point(at, halfWidth)],
        [1, point(0.25, 0.0625)],
        [2, point(0.25, 0.0625)],
      ])
    expect(judge(shares(0.5625, 0.05)).reason).toBe('harmless')
    expect(judge(shares(0.5625, 0.0625 + 1e-6)).reason).toBe('inside')
    expect(judge(shares(0.5625, 0.0625 - 1e-6)).reason).toBe('harmless')
  })
  test('a visible difference larger than the tolerance: disagrees, and the largest one is told', () => {
    const judged = judge(
      distribution([
        [0, point(0.125, 0.1)],
        [1, point(0.375, 0.3)],
        [2, point(0.5, 0.1)],
      ]),
      0.2,
    )
    expect(judged).toMatchObject({
      verdict: 'disagrees',
      reason: 'off',
      difference: -0.375,
      exact: 0.5,
      estimate: 0.125,
    })
    expect(
      judge(
        distribution([
          [0, point(0.25, 0.1)],
          [1, point(0.25, 0.1)],
          [2, point(0.25, 0.1)],
        ]),
      ).reason,
    ).toBe('too wide')
    expect(
      judge(
        distribution([
          [0, point(0.25 - tiny, 0.1)],
          [1, point(0.25, 0.1)],
          [2, point(0.25, 0.1)],
        ]),
      ).reason,
    ).toBe('off')
  })
  test('the p-value is the smallest, times the number of values', () => {
    const seen = distribution([
      [0, point(0.75, 1, { standardError: 0.25 / Math.sqrt(3), degreesOfFreedom: 1 })], // Cauchy beyond √3: 1/3
      [1, point(0.25, 1)],
      [2, point(0.25, 1)],
    ])
    expect(judge(seen).pValue).toBeCloseTo(1, 13)
    const two = judgeMeasure(
      {
        points: [
          [0, 0.5],
          [1, 0.5],
        ],
        errorBound: 0,
      },
      distribution([seen.points[0], point(0.5, 1)].map((p, i) => [i, p])),
      quarter,
      undefined,
    )
    expect(two.pValue).toBeCloseTo(2 / 3, 13)
  })
  // A value that no one of 16 independent replications met: (1 - share)^16 is what chance does.
  test.each([
    { share: 0.25, reason: 'off', pValue: 2 * 0.75 ** 16 },
    { share: 0.125, reason: 'too wide', pValue: 2 * 0.875 ** 16 },
    { share: 0.0625, reason: 'inside', pValue: 2 * 0.9375 ** 16 },
  ])('a share of $share that was never met: $reason', ({ share, reason, pValue }) => {
    const judged = judgeMeasure(
      {
        points: [
          [0, 1 - share],
          [1, share],
        ],
        errorBound: 0,
      },
      distribution([[0, point(1)]]),
      { kind: 'relative', value: 0.0625 },
      undefined,
    )
    expect(judged).toMatchObject({ reason, adjustedHalfWidth: 0 })
    expect(Math.abs(judged.difference)).toBe(share)
    expect(judged.pValue).toBeCloseTo(Math.min(1, pValue), 13)
  })
  test('a value that the model never takes is off where it is seen often', () => {
    const seen = distribution([
      [0, point(0.5, 0.01)],
      [1, point(0.25, 0.01)],
      [2, point(0.125, 0.01)],
      [3, point(0.125, 0.01)],
    ])
    expect(judge(seen, 0.0625).reason).toBe('off')
  })
  test('without an interval nothing is decided, unless the shares are the same', () => {
    const seen = (at: number) =>
      distribution([
        [0, point(at)],
        [1, point(0.25, 0.1)],
        [2, point(0.25, 0.1)],
      ])
    expect(judge(seen(0.625))).toMatchObject({ verdict: 'undecided', reason: 'no interval' })
    expect(judge(seen(0.5)).reason).toBe('inside')
    expect(judge(seen(0.625), 0.25, 0.125).reason).toBe('inside')
    expect(judge(seen(0.625), 0.25, 0.12).reason).toBe('no interval')
  })
  test('one replication that saw nothing else says nothing', () => {
    const lone = distribution([[0, point(1, undefined, { batches: 1 })]])
    expect(judge(lone)).toMatchObject({ verdict: 'undecided', reason: 'no interval' })
    expect(judge(distribution([]))).toMatchObject({ verdict: 'undecided', pValue: 1 })
  })
})
