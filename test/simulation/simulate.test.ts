import { Matrix, solve } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import type { Chain } from '../../src/chain/chain.js'
import { StillmarkError } from '../../src/errors/stillmark-error.js'
import type { CompiledMeasure } from '../../src/model/model.js'
import type { Scenario } from '../../src/scenario/scenario.js'
import { streamOf } from '../../src/simulation/random-stream.js'
import { simulate } from '../../src/simulation/simulate.js'
import { batchMeansOf, deviations, digitsOf, meanOf, sharesOf } from './batch-figures.js'
import { averageOf, distributionOf, handMadeChain, type Move, movesOf, ringChain } from './hand-made-chain.js'
import { byFirst, handMadeModel, singleDesk } from './hand-made-model.js'

const runs = { seed: 'facts', replications: 40, warmUp: 50, runLength: 2000, batches: 4 }

// Two-sided Student-t with 39 degrees of freedom: beyond 5 deviations once in 80,000 comparisons. There are below 200.
const farOff = 5

/** Shares of a birth-death chain by products of ratios, independent of the program's solvers. */
function birthDeathShares(births: readonly number[], deaths: readonly number[]): number[] {
  const weights = [1]
  for (const [k, birth] of births.entries()) weights.push((weights[k] * birth) / deaths[k])
  const total = weights.reduce((sum, weight) => sum + weight, 0)
  return weights.map((weight) => weight / total)
}

const upTo = (n: number) => Array.from({ length: n }, (_, k) => k)

test.each([
  { what: 'two states', births: [1], deaths: [3] },
  { what: 'a single desk with 6 places', births: upTo(6).map(() => 0.8), deaths: upTo(6).map(() => 1) },
  { what: '8 doors, Erlang loss', births: upTo(8).map(() => 5), deaths: upTo(8).map((k) => k + 1) },
  {
    what: '5 machines, 2 repairers',
    births: upTo(5).map((k) => (5 - k) * 0.3),
    deaths: upTo(5).map((k) => Math.min(k + 1, 2)),
  },
  { what: 'rates six decades apart', births: [1e-3, 1e3], deaths: [1, 1e3] },
])('$what: averages, shares and frequencies have their closed values', async ({ births, deaths }) => {
  const n = births.length + 1
  const shares = birthDeathShares(births, deaths)
  const { model, chain } = handMadeChain(
    'continuous',
    n,
    births.flatMap((birth, k): Move[] => [
      [k, k + 1, birth],
      [k + 1, k, deaths[k]],
    ]),
    [
      averageOf('number', upTo(n)),
      averageOf(
        'full',
        upTo(n).map((k) => (k === n - 1 ? 1 : 0)),
      ),
      movesOf('last_filled', n - 2, n - 1),
      distributionOf('spread', upTo(n)),
    ],
  )
  const observed = await simulate(model, chain, runs, { workers: 1 })
  const number = shares.reduce((sum, share, k) => sum + share * k, 0)
  expect(Math.abs(deviations(observed, 'number', number))).toBeLessThan(farOff)
  expect(Math.abs(deviations(observed, 'full', shares[n - 1]))).toBeLessThan(farOff)
  expect(Math.abs(deviations(observed, 'last_filled', shares[n - 2] * births[n - 2]))).toBeLessThan(farOff)
  // The histogram is another way to the same numbers, batch by batch.
  const { values, shares: seen, batches } = sharesOf(observed, 'spread')
  expect([Array.from(values), batches]).toEqual([upTo(n), 4])
  batchMeansOf(observed, 'number').forEach((mean, row) => {
    const byHistogram = upTo(n).reduce((sum, k) => sum + k * seen[row * n + k], 0)
    expect(Math.abs(byHistogram - mean)).toBeLessThan(1e-12 * n)
    expect(Math.abs(upTo(n).reduce((sum, k) => sum + seen[row * n + k], 0) - 1)).toBeLessThan(1e-12)
  })
})

describe.each(['continuous', 'discrete'] as const)('in %s time', (time) => {
  // Shares by a dense solve of ml-matrix. 50 chains × 1 comparison, see `farOff`.
  test('50 random chains spend their time as their balance equations say', async () => {
    const draws = streamOf(`random chains in ${time} time`, 0)
    for (let k = 0; k < 50; k++) {
      const n = 2 + Math.floor((draws.nextPositive() - 2 ** -53) * 7)
      const rates = upTo(n).map((i) =>
        upTo(n).map((j) => (j === (i + 1) % n || draws.nextPositive() < 0.4 ? draws.nextPositive() : 0)),
      )
      if (time === 'discrete') {
        for (const [i, row] of rates.entries()) {
          if (row[i] === 0) row[i] = 0.1 // no period: the warm-up must do
          const total = row.reduce((sum, rate) => sum + rate, 0)
          for (let j = 0; j < n; j++) row[j] /= total
        }
      }
      const balance = upTo(n).map((j) =>
        upTo(n).map((i) =>
          j === 0 ? 1 : i === j ? rates[i][i] - rates[i].reduce((sum, rate) => sum + rate, 0) : rates[i][j],
        ),
      )
      const shares = solve(new Matrix(balance), Matrix.columnVector(upTo(n).map((j) => (j === 0 ? 1 : 0)))).to1DArray()
      const moves = rates.flatMap((row, i) => row.flatMap((rate, j): Move[] => (rate > 0 ? [[i, j, rate]] : [])))
      const { model, chain } = handMadeChain(time, n, moves, [
        averageOf('state', upTo(n)),
        movesOf('into_0', undefined, 0),
      ])
      const observed = await simulate(model, chain, { ...runs, seed: `chain ${k}` }, { workers: 1 })
      const state = shares.reduce((sum, share, i) => sum + share * i, 0)
      // Firings that leave the state as it is count too.
      const into0 = shares.reduce((sum, share, i) => sum + share * rates[i][0], 0)
      expect(Math.abs(deviations(observed, 'state', state))).toBeLessThan(farOff)
      expect(Math.abs(deviations(observed, 'into_0', into0))).toBeLessThan(farOff)
    }
  })

  test('1, 2 and 3 workers give the same digits', async () => {
    const { model, chain } = ringChain(100, time)
    const settings = { seed: 'night-shift-7', replications: 7, warmUp: 10, runLength: 3000, batches: 6 }
    const classOf = new Int32Array(100)
    const observed = await Promise.all(
      [1, 2, 3].map((workers) => simulate(model, chain, settings, { workers, classOf })),
    )
    expect(observed.map(({ workers }) => workers)).toEqual([1, 2, 3])
    expect(digitsOf(observed[1])).toBe(digitsOf(observed[0]))
    expect(digitsOf(observed[2])).toBe(digitsOf(observed[0]))
  })

  test('warm-up and batches do not change the path: finer batches average to the coarser ones', async () => {
    const { model, chain } = ringChain(20, time)
    const settings = { seed: 'one path', replications: 2, warmUp: 0, runLength: 1200, batches: 12 }
    const fine = batchMeansOf(await simulate(model, chain, settings, { workers: 1 }), 'level')
    const coarse = batchMeansOf(await simulate(model, chain, { ...settings, batches: 3 }, { workers: 1 }), 'level')
    const late = await simulate(model, chain, { ...settings, warmUp: 400, runLength: 800, batches: 2 }, { workers: 1 })
    coarse.forEach((mean, k) => {
      expect(Math.abs(meanOf(fine.slice(4 * k, 4 * k + 4)) - mean)).toBeLessThan(1e-12 * 10)
    })
    batchMeansOf(late, 'level').forEach((mean, k) => {
      expect(Math.abs(mean - coarse[k < 2 ? k + 1 : k + 2])).toBeLessThan(1e-12 * 10)
    })
  })

  test('other seeds and other replications take other paths', async () => {
    const { model, chain } = ringChain(20, time)
    const settings = { seed: 'a', replications: 50, warmUp: 0, runLength: 100, batches: 20 }
    const paths = new Set<string>()
    for (const seed of ['a', 'b']) {
      const means = batchMeansOf(await simulate(model, chain, { ...settings, seed }, { workers: 1 }), 'level')
      for (let r = 0; r < 50; r++) paths.add(means.slice(20 * r, 20 * r + 20).join())
    }
    expect(paths.size).toBe(100)
  })

  test('an absorbing state is kept until the end, and the class each replication ended in is told', async () => {
    const half = time === 'discrete' ? 0.5 : 1
    const { model, chain } = handMadeChain(
      time,
      3,
      [
        [0, 1, half],
        [0, 2, half],
      ],
      [averageOf('in_1', [0, 1, 0]), averageOf('left', [0, 1, 1]), movesOf('moves')],
    )
    const settings = { seed: 'ends', replications: 64, warmUp: 100, runLength: 50, batches: 5 }
    const observed = await simulate(model, chain, settings, { workers: 1, classOf: Int32Array.of(-1, 0, 1) })
    expect(new Set(observed.endedIn)).toEqual(new Set([0, 1]))
    expect(observed.events).toBe(64)
    expect(new Set(batchMeansOf(observed, 'left'))).toEqual(new Set([1]))
    expect(new Set(batchMeansOf(observed, 'moves'))).toEqual(new Set([0]))
    const in1 = batchMeansOf(observed, 'in_1')
    observed.endedIn?.forEach((ended, r) => {
      expect(in1.slice(5 * r, 5 * r + 5)).toEqual(Array(5).fill(ended === 0 ? 1 : 0))
    })
  })
})

describe('discrete time, counted by hand', () => {
  const ring = (size: number) =>
    handMadeChain(
      'discrete',
      size,
      upTo(size).map((k): Move => [k, (k + 1) % size, 1]),
      [
        averageOf('place', upTo(size)),
        movesOf('into_0', undefined, 0),
        movesOf('all'),
        distributionOf('spread', upTo(size)),
      ],
    )
  const run = async (settings: { warmUp: number; runLength: number; batches: number }) => {
    const { model, chain } = ring(3)
    return simulate(model, chain, { seed: 'no draw matters', replications: 1, ...settings }, { workers: 1 })
  }

  // Steps 0…5 are in 0 1 2 0 1 2; the moves into 0 end steps 2 and 5.
  test.each([
    { warmUp: 0, runLength: 6, batches: 1, place: [1], into0: [2 / 6] },
    { warmUp: 0, runLength: 6, batches: 2, place: [1, 1], into0: [1 / 3, 1 / 3] },
    { warmUp: 0, runLength: 4, batches: 4, place: [0, 1, 2, 0], into0: [0, 0, 1, 0] },
    { warmUp: 2, runLength: 4, batches: 2, place: [2 / 2, 3 / 2], into0: [1 / 2, 1 / 2] },
    { warmUp: 1, runLength: 5, batches: 1, place: [6 / 5], into0: [2 / 5] },
  ])('$batches batches in $runLength steps after $warmUp', async ({ place, into0, ...settings }) => {
    const observed = await run(settings)
    expect(batchMeansOf(observed, 'place')).toEqual(place)
    expect(batchMeansOf(observed, 'into_0')).toEqual(into0)
    expect(new Set(batchMeansOf(observed, 'all'))).toEqual(new Set([1]))
    expect(observed.events).toBe(settings.warmUp + settings.runLength)
  })

  test('a border within a step splits its time, and gives its firing to the later batch', async () => {
    const observed = await run({ warmUp: 0, runLength: 3, batches: 2 })
    expect(batchMeansOf(observed, 'place')).toEqual([0.5 / 1.5, 2.5 / 1.5])
    expect(batchMeansOf(observed, 'all')).toEqual([1 / 1.5, 2 / 1.5])
  })

  test('several borders within a step', async () => {
    const observed = await run({ warmUp: 0, runLength: 2, batches: 8 })
    expect(batchMeansOf(observed, 'place')).toEqual([0, 0, 0, 0, 1, 1, 1, 1])
    expect(batchMeansOf(observed, 'all')).toEqual([0, 0, 0, 4, 0, 0, 0, 4])
  })

  test('shares of time over 3,000,000 steps, across many pieces of the loop, are exact', async () => {
    const observed = await run({ warmUp: 3, runLength: 3_000_000, batches: 2 })
    expect(batchMeansOf(observed, 'place')).toEqual([1, 1])
    expect(batchMeansOf(observed, 'into_0')).toEqual([1 / 3, 1 / 3])
    expect(Array.from(sharesOf(observed, 'spread').shares)).toEqual(Array(6).fill(1 / 3))
  })

  test('half a step is refused', async () => {
    await expect(run({ warmUp: 0.5, runLength: 6, batches: 1 })).rejects.toMatchObject({ code: 'bad-run-settings' })
    await expect(run({ warmUp: 0, runLength: 6.5, batches: 1 })).rejects.toMatchObject({ code: 'bad-run-settings' })
  })
})

test('a value that is the same in every state is its own average, to the last digit', async () => {
  const { model, chain } = handMadeChain(
    'continuous',
    2,
    [
      [0, 1, 1],
      [1, 0, 1e6],
    ],
    [averageOf('seven', [7, 7])],
  )
  const settings = { seed: 'constant', replications: 3, warmUp: 1e9, runLength: 1000, batches: 16 }
  const observed = await simulate(model, chain, { ...settings, warmUp: 1000 }, { workers: 1 })
  for (const mean of batchMeansOf(observed, 'seven')) expect(Math.abs(mean - 7)).toBeLessThan(7e-14)
})

test('short stays keep their time in a batch of a billion time units', async () => {
  // Stays of 1e-9 and of 1e7 on average: the short ones are below the last digit of the batch's clock.
  const { model, chain } = handMadeChain(
    'continuous',
    2,
    [
      [0, 1, 1e9],
      [1, 1, 1e9 - 1e-7],
      [1, 0, 1e-7],
    ],
    [averageOf('in_0', [1, 0]), movesOf('back', 1, 0)],
  )
  const settings = { seed: 'long', replications: 2, warmUp: 0, runLength: 1e9, batches: 1 }
  const observed = await simulate(model, chain, settings, { workers: 1, maxEvents: 1e6 })
  expect(observed.stoppedEarly?.map(({ replication, batches }) => [replication, batches])).toEqual([
    [0, 0],
    [1, 0],
  ])
  // 1e6 stays of 1e-9: 1e-3 time units, within 5 standard errors of 1e-3 relative (4 in 10 million).
  for (const { time } of observed.stoppedEarly ?? []) expect(Math.abs(time / 1e-3 - 1)).toBeLessThan(5e-3)
  for (const mean of batchMeansOf(observed, 'in_0')) expect(mean).toBeNaN()
})

test('where shares would take too much memory batches are joined, and the result says so', async () => {
  const size = 9000
  const { model, chain } = handMadeChain(
    'discrete',
    size,
    upTo(size).map((k): Move => [k, (k + 1) % size, 1]),
    [distributionOf('spread', upTo(size))],
  )
  const settings = { seed: 'joined', replications: 100, warmUp: 0, runLength: 12 * size, batches: 12 }
  const { shares, batches } = sharesOf(await simulate(model, chain, settings, { workers: 1 }), 'spread')
  expect(batches).toBe(6) // 100 × 12 × 9,000 is above 2^23, 100 × 6 × 9,000 below
  expect(shares.every((share) => Math.abs(share * size - 1) < 1e-12)).toBe(true)
})

describe('a run that is ended', () => {
  const endless = { seed: 'endless', replications: 4, warmUp: 0, runLength: 1e13, batches: 1 }

  test.each([1, 2])('an interruption stops %i workers within 0.2 s', async (workers) => {
    const { model, chain } = ringChain(1000, 'continuous')
    const controller = new AbortController()
    let asked = 0
    setTimeout(() => {
      asked = performance.now()
      controller.abort()
    }, 400)
    const error = await simulate(model, chain, endless, { workers, signal: controller.signal }).catch((e) => e)
    // 0.2 s is the promise; the machine of the tests may be busy.
    expect(performance.now() - asked).toBeLessThan(400)
    expect(error).toBeInstanceOf(StillmarkError)
    expect([error.kind, error.code]).toEqual(['interrupted', 'interrupted'])
  })

  test.each([1, 2])('an error thrown by the progress report ends %i workers and is passed on', async (workers) => {
    const { model, chain } = ringChain(1000, 'continuous')
    const limit = new StillmarkError({ code: 'time-limit', what: 'Over.' }, 'limit')
    const seen: { events: number; fraction: number }[] = []
    const error = await simulate(model, chain, endless, {
      workers,
      onProgress: (done) => {
        seen.push(done)
        if (seen.length > 5) throw limit
      },
    }).catch((e) => e)
    expect(error).toBe(limit)
    expect(seen.at(-1)!.events).toBeGreaterThan(0)
    for (let k = 1; k < seen.length; k++) expect(seen[k].events).toBeGreaterThanOrEqual(seen[k - 1].events)
  })

  test("a signal's own reason is passed on", async () => {
    const { model, chain } = ringChain(10, 'continuous')
    const reason = new StillmarkError({ code: 'time-limit', what: 'Over.' }, 'limit')
    await expect(simulate(model, chain, endless, { workers: 1, signal: AbortSignal.abort(reason) })).rejects.toBe(
      reason,
    )
  })

  test('progress ends at all', async () => {
    const { model, chain } = ringChain(10, 'discrete')
    let last = { events: 0, fraction: 0 }
    const settings = { seed: 'p', replications: 2, warmUp: 5, runLength: 100, batches: 4 }
    await simulate(model, chain, settings, { workers: 2, onProgress: (done) => (last = done) })
    expect(last).toEqual({ events: 210, fraction: 1 })
  })
})

test.each([
  { replications: 0 },
  { replications: 1.5 },
  { batches: 0 },
  { runLength: 0 },
  { runLength: Number.NaN },
  { runLength: Number.POSITIVE_INFINITY },
  { warmUp: -1 },
  { warmUp: Number.NaN },
])('%j is refused', async (wrong) => {
  const { model, chain } = ringChain(10, 'continuous')
  const settings = { seed: '', replications: 1, warmUp: 0, runLength: 1, batches: 1, ...wrong }
  await expect(simulate(model, chain, settings)).rejects.toMatchObject({ code: 'bad-run-settings', kind: 'input' })
})

test('firings of a model by variables are counted by their labels, those that change nothing included', async () => {
  // One place: come at rate 2 when free, turned away at rate 2 when taken, go at rate 3: taken 2/5 of the time.
  const frequency = (name: string, ...weights: number[]): CompiledMeasure => ({
    name,
    kind: 'frequency',
    of: { kind: 'frequency', weights: Float64Array.from(weights) },
  })
  const moves = [
    { from: 0, label: 0, rate: 2, next: [1] },
    { from: 1, label: 1, rate: 2, next: [1] },
    { from: 1, label: 2, rate: 3, next: [0] },
  ]
  const model = handMadeModel(
    'continuous',
    [0],
    ['come', 'turned_away', 'go'],
    ({ 0: n }) => moves.filter(({ from }) => from === n),
    [
      frequency('coming', 1, 0, 0),
      frequency('lost', 0, 1, 0),
      frequency('all_offered', 1, 1, 0),
      frequency('cost', 0, 2.5, -1),
      { name: 'taken', kind: 'share', of: { kind: 'average', value: byFirst((n) => n) } },
    ],
  )
  const chain: Chain = {
    time: 'continuous',
    size: 2,
    start: 0,
    width: 1,
    values: Int32Array.of(0, 1),
    elements: ['x0'],
    rowStart: Int32Array.of(0, 1, 3),
    target: Int32Array.of(1, 1, 0),
    rate: Float64Array.of(2, 2, 3),
    rateError: new Float64Array(3),
    label: Int32Array.of(0, 1, 2),
  }
  for (const enumerated of [chain, undefined]) {
    const observed = await simulate(model, enumerated, runs, { workers: 1 })
    const expected = { coming: 1.2, lost: 0.8, all_offered: 2, cost: 0.8 * 2.5 - 1.2, taken: 0.4 }
    for (const [name, value] of Object.entries(expected)) {
      expect(Math.abs(deviations(observed, name, value))).toBeLessThan(farOff)
    }
  }
})

test('a measure without a finite value in some state is refused, naming the state', async () => {
  const { model, chain } = handMadeChain('continuous', 2, [[0, 1, 1]], [averageOf('odd', [1, Number.NaN])])
  await expect(simulate(model, chain, runs)).rejects.toMatchObject({
    code: 'not-finite',
    what: expect.stringMatching(/s1/),
  })
})

test('workers that can not start end the run with an error, and leave nothing behind', async () => {
  const unreadable = { ...singleDesk(1, 2), scenario: { body: 'no scenario' } as unknown as Scenario }
  await expect(simulate(unreadable, undefined, runs, { workers: 2 })).rejects.toBeInstanceOf(Error)
})
