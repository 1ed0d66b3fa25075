import { expect, test } from 'vitest'
import { simulatePilot } from '../../src/simulation/pilot.js'
import { simulate } from '../../src/simulation/simulate.js'
import { batchMeansOf, deviations, meanOf, sharesOf } from './batch-figures.js'
import { byFirst, handMadeModel, singleDesk } from './hand-made-model.js'

// Beyond 5 deviations of a Student-t with 39 degrees of freedom once in 80,000 comparisons.
const farOff = 5
const runs = { seed: 'unbounded', replications: 40, warmUp: 100, runLength: 3000, batches: 4 }

test('a single desk without bound has the closed values of M/M/1', async () => {
  const observed = await simulate(singleDesk(0.5, 1), undefined, runs, { workers: 1 })
  expect(Math.abs(deviations(observed, 'present', 1))).toBeLessThan(farOff) // ρ/(1 - ρ)
  expect(Math.abs(deviations(observed, 'idle', 0.5))).toBeLessThan(farOff) // 1 - ρ
  expect(Math.abs(deviations(observed, 'comings', 0.5))).toBeLessThan(farOff)
  expect(Math.abs(deviations(observed, 'goings', 0.5))).toBeLessThan(farOff)
  const ratio = observed.measures.stay_time
  if (ratio.kind !== 'ratio') throw new Error('no ratio')
  expect(Array.from(ratio.top)).toEqual(batchMeansOf(observed, 'present'))
  expect(Array.from(ratio.bottom)).toEqual(batchMeansOf(observed, 'comings'))
  const { values, shares, batches } = sharesOf(observed, 'spread')
  expect(batches).toBe(4)
  batchMeansOf(observed, 'present').forEach((mean, row) => {
    const byHistogram = values.reduce((sum, value, k) => sum + value * shares[row * values.length + k], 0)
    expect(Math.abs(byHistogram - mean)).toBeLessThan(1e-11)
  })
  expect(observed.finalStates?.length).toBe(40)
  expect(observed.endedIn).toBeUndefined()
})

// Coming - going within the batches, plus what the warm-up left, is what stands there at the end.
test('comings less goings are what is there at the end', async () => {
  const observed = await simulate(singleDesk(2, 1), undefined, { ...runs, warmUp: 0, batches: 1 }, { workers: 1 })
  const comings = batchMeansOf(observed, 'comings')
  const goings = batchMeansOf(observed, 'goings')
  observed.finalStates?.forEach((there, r) => {
    expect(Math.round((comings[r] - goings[r]) * 3000)).toBe(there)
  })
  expect(meanOf(Array.from(observed.finalStates ?? [])) / 3000).toBeCloseTo(1, 1)
})

test('steps are counted as on an enumerated chain', async () => {
  const ring = handMadeModel(
    'discrete',
    [0],
    ['turn'],
    ({ 0: place }) => [{ label: 0, rate: 1, next: [(place + 1) % 3] }],
    [
      { name: 'place', kind: 'average', of: { kind: 'average', value: byFirst((place) => place) } },
      { name: 'turns', kind: 'frequency', of: { kind: 'frequency', weights: Float64Array.of(1) } },
    ],
  )
  const observe = (warmUp: number, runLength: number, batches: number) =>
    simulate(ring, undefined, { seed: '', replications: 1, warmUp, runLength, batches }, { workers: 1 })
  expect(batchMeansOf(await observe(2, 4, 2), 'place')).toEqual([1, 1.5])
  expect(batchMeansOf(await observe(0, 3, 2), 'place')).toEqual([0.5 / 1.5, 2.5 / 1.5])
  expect(batchMeansOf(await observe(0, 3, 2), 'turns')).toEqual([1 / 1.5, 2 / 1.5])
  expect(batchMeansOf(await observe(0, 300_000, 1), 'place')).toEqual([1])
})

test('where nothing is enabled time runs out in place', async () => {
  for (const time of ['continuous', 'discrete'] as const) {
    const stops = handMadeModel(
      time,
      [0],
      ['once'],
      ({ 0: n }) => (n === 0 ? [{ label: 0, rate: 1, next: [1] }] : []),
      [{ name: 'done', kind: 'share', of: { kind: 'average', value: byFirst((n) => n) } }],
    )
    const settings = { seed: 'a', replications: 3, warmUp: 100, runLength: 8, batches: 4 }
    const observed = await simulate(stops, undefined, settings, { workers: 1 })
    expect(batchMeansOf(observed, 'done')).toEqual(Array(12).fill(1))
    expect([observed.events, Array.from(observed.finalStates ?? [])]).toEqual([3, [1, 1, 1]])
  }
})

// The expected time of infinitely many births at rates n² is Σ 1/n² = 1.645: the run can't pass it.
test('an explosive model stops at its limit of events and says where', async () => {
  const explosive = handMadeModel(
    'continuous',
    [1],
    ['birth'],
    ({ 0: n }) => [{ label: 0, rate: n * n, next: [n + 1] }],
    [{ name: 'size', kind: 'average', of: { kind: 'average', value: byFirst((n) => n) } }],
  )
  const settings = { seed: 'explodes', replications: 20, warmUp: 0, runLength: 1000, batches: 2 }
  const observed = await simulate(explosive, undefined, settings, { workers: 1, maxEvents: 20_000 })
  expect(observed.stoppedEarly?.length).toBe(20)
  expect(observed.events).toBe(400_000)
  expect(Array.from(observed.finalStates ?? [])).toEqual(Array(20).fill(20_001))
  // Standard deviation of that time: sqrt(Σ 1/n⁴) = 1.04, of a mean of 20: 0.233.
  const mean = meanOf(observed.stoppedEarly?.map(({ time }) => time) ?? [])
  expect(Math.abs(mean - Math.PI ** 2 / 6)).toBeLessThan(5 * 0.233)
  expect(batchMeansOf(observed, 'size').every(Number.isNaN)).toBe(true)
})

test('a state beyond 2^53 is refused by the name of the variable', async () => {
  const doubles = handMadeModel('discrete', [1], ['double'], ({ 0: n }) => [{ label: 0, rate: 1, next: [2 * n] }], [])
  const settings = { seed: '', replications: 1, warmUp: 0, runLength: 100, batches: 1 }
  const error = await simulate(doubles, undefined, settings, { workers: 1 }).catch((e) => e)
  expect([error.code, error.kind, error.where]).toEqual(['state-too-large', 'limit', { key: 'state.x0' }])
})

test('a pilot follows the start, with draws of its own and within its events', async () => {
  const desk = singleDesk(0.9, 1)
  const settings = { seed: 'pilot', replications: 400, length: 40, points: 8 }
  const pilot = await simulatePilot(desk, undefined, settings, { workers: 1 })
  expect(Object.keys(pilot.measures)).toEqual(['present', 'idle', 'comings', 'goings', 'stay_time', 'spread'])
  const { present, spread, stay_time } = pilot.measures
  if (present.kind !== 'mean' || spread.kind !== 'mean' || stay_time.kind !== 'ratio') throw new Error('kinds differ')
  expect(present.means.length).toBe(3200)
  expect(spread.means).toEqual(present.means) // the mean of a distribution's value
  expect(stay_time.top).toEqual(present.means)
  // It starts empty: the first interval holds fewer than the last.
  const at = (point: number) => meanOf(Array.from({ length: 400 }, (_, r) => present.means[r * 8 + point]))
  expect(at(7) - at(0)).toBeGreaterThan(1)
  const run = await simulate(desk, undefined, { ...settings, warmUp: 0, runLength: 40, batches: 8 }, { workers: 1 })
  expect(batchMeansOf(run, 'present')[0]).not.toBe(present.means[0])
  const short = await simulatePilot(desk, undefined, settings, { workers: 1, maxEvents: 10 })
  expect(short.events).toBeLessThanOrEqual(4000)
  expect(short.stoppedEarly!.length).toBeGreaterThan(390)
})
