import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { batchTest, vonNeumannRatio } from '../../src/estimation/von-neumann.js'
import { draws, referenceCases, referenceData, relative } from './series.js'

describe('ratio', () => {
  // nist-strd.json, worked in exact fractions there; the ratio of NumAcc3 loses digits since its mean is 10⁷ deviations.
  test.each([
    { name: 'Lew', within: 1e-14 },
    { name: 'Mavro', within: 1e-11 },
    { name: 'NumAcc3', within: 1e-8 },
  ])('of the published series $name', ({ name, within }) => {
    const { values } = referenceCases('nist-strd').find(({ id }) => id === `procedures-${name}`)!
    const expected = Number(values.vonNeumannRatio_sumSqDiff_over_sumSq)
    expect(relative(vonNeumannRatio(referenceData(name))!, expected)).toBeLessThan(within)
  })
  test('by hand: 1, 2, 4 has steps 1 + 4 over squares 14/3', () => {
    expect(vonNeumannRatio(Float64Array.of(1, 2, 4))).toBeCloseTo(15 / 14, 15)
  })
  test('a constant series has none', () => {
    expect(vonNeumannRatio(Float64Array.of(0.1, 0.1, 0.1, 0.1))).toBeUndefined()
  })
})

describe('p-value', () => {
  // critical-values.json: Imhof's inversion of the exact law. The beta law stands in for it here.
  const { values } = referenceCases('critical-values').find(({ id }) => id === 'von-neumann-ratio')!
  test.each(
    Object.entries(values).map(([key, ratio]) => {
      const [, n, level] = /^n(\d+)_lower_(.+)$/.exec(key) as RegExpExecArray
      return { n: Number(n), level: Number(level), ratio: Number(ratio) }
    }),
  )('$n batches: a ratio of $ratio or less has probability $level', ({ n, level, ratio }) => {
    const { pValue } = batchTest(seriesWithRatio(n, ratio), 1, n)!
    expect(Math.abs(pValue - level)).toBeLessThan(n === 10 ? 2.2e-4 : 3e-5)
  })

  // An honest test at 5 % rejects 415 to 588 of 10,000 in all but 1 of 15,000 runs (binomial, four standard deviations).
  test.each([
    [2, 8],
    [4, 8],
    [9, 16],
  ])('%i independent replications of %i batches are called correlated at the stated rate', (replications, batches) => {
    const { normal } = draws('honest ratio')
    let rejected = 0
    for (let i = 0; i < 10_000; i++) {
      const series = Float64Array.from({ length: replications * batches }, normal)
      if (batchTest(series, replications, batches)!.pValue < 0.05) rejected++
    }
    expect(rejected).toBeGreaterThan(415)
    expect(rejected).toBeLessThan(588)
  })

  test('replications are held against their own means: a shift of one changes nothing', () => {
    const { normal } = draws('shift')
    const series = Float64Array.from({ length: 20 }, normal)
    const shifted = series.map((x, i) => (i < 10 ? x : x + 64))
    const one = batchTest(series, 2, 10)!
    expect(batchTest(shifted, 2, 10)!.ratio).toBeCloseTo(one.ratio, 12)
    const first = vonNeumannRatio(series.subarray(0, 10))!
    const second = vonNeumannRatio(series.subarray(10))!
    expect(one.ratio).toBeCloseTo((first + second) / 2, 14)
  })
  test('a replication that does not vary says nothing; where none does, nothing is tested', () => {
    const series = Float64Array.of(1, 3, 2, 5, 4, 4, 4, 4)
    expect(batchTest(series, 2, 4)).toEqual(batchTest(series.subarray(0, 4), 1, 4))
    expect(batchTest(new Float64Array(8).fill(3), 2, 4)).toBeUndefined()
  })
  test('a steady climb is seen, an alternation is not taken for correlation', () => {
    expect(
      batchTest(
        Float64Array.from({ length: 16 }, (_, i) => i),
        1,
        16,
      )!.pValue,
    ).toBeLessThan(1e-9)
    expect(
      batchTest(
        Float64Array.from({ length: 16 }, (_, i) => i % 2),
        1,
        16,
      )!.pValue,
    ).toBeGreaterThan(0.999)
  })
  test('scale and a power-of-two shift change nothing', () =>
    fc.assert(
      fc.property(fc.array(fc.integer({ min: -99, max: 99 }), { minLength: 8, maxLength: 8 }), (values) => {
        fc.pre(new Set(values).size > 1)
        const one = batchTest(Float64Array.from(values), 1, 8)!
        expect(
          batchTest(
            Float64Array.from(values, (x) => 4 * x),
            1,
            8,
          )!,
        ).toEqual(one)
      }),
      { seed: 7, numRuns: 200 },
    ))
})

/** A series of n numbers with the given ratio: a cosine mixed with an alternation, weighed by bisection. */
function seriesWithRatio(n: number, ratio: number): Float64Array {
  const at = (weight: number) =>
    Float64Array.from({ length: n }, (_, i) => Math.cos((Math.PI * (i + 0.5)) / n) + weight * (i % 2))
  let low = 0
  let high = 100
  for (let step = 0; step < 200; step++) {
    const middle = (low + high) / 2
    if (vonNeumannRatio(at(middle))! < ratio) low = middle
    else high = middle
  }
  return at(high)
}
