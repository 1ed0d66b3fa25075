import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { numberIn, unboundedAnswer } from './solved-unbounded.js'

/** Within 1e-10, and the bound holds; the expected value is exact but for its last digit. */
function holds(answer: ReturnType<typeof unboundedAnswer>, name: string, expected: number, tolerance = 1e-12): void {
  const { value, errorBound } = numberIn(answer, name)
  expect(Math.abs(value - expected)).toBeLessThanOrEqual(tolerance * Math.abs(expected))
  expect(Math.abs(value - expected)).toBeLessThanOrEqual(errorBound + 2 ** -52 * Math.abs(expected))
  expect(errorBound).toBeLessThanOrEqual(1e-10 * Math.abs(expected))
}

describe('one station', () => {
  const station = (load: string, measures: string) =>
    unboundedAnswer(`
state: { n: { from: 0, start: 0 } }
transitions:
  enter: { rate: ${load}, then: { n: n + 1 } }
  leave: { when: n > 0, rate: 1, then: { n: n - 1 } }
measures:
${measures}`)

  test('at load 0.999 the moments keep 12 digits', () => {
    // Geometric law: mean r/(1-r), second moment r(1+r)/(1-r)^2, third r(1+4r+r^2)/(1-r)^3.
    const answer = station('0.999', '  a: { average: n }\n  b: { average: n^2 }\n  c: { average: n^3 }')
    holds(answer, 'a', 999)
    holds(answer, 'b', 999 * 1999)
    holds(answer, 'c', (0.999 * 5.994001) / 1e-9, 1e-11)
  })
  test('a very rare backlog keeps its digits', () => holds(station('0.25', '  a: { share: n >= 40 }'), 'a', 0.25 ** 40))
  test('a value that goes down far out is averaged too', () => {
    // Σ (1-r) r^n / (n + 1) = (1-r)/r · -log(1-r).
    holds(station('0.5', '  a: { average: 1 / (n + 1) }'), 'a', Math.log(2))
  })
  test('a quantile on the very edge of a level says by how much it may be off', () => {
    // P(n <= 1) = 0.75 exactly at load 1/2.
    const { value, errorBound } = numberIn(station('0.5', '  a: { quantile: n, level: 0.75 }'), 'a')
    expect(value <= 1 && value + errorBound >= 1).toBe(true)
  })
  test('what grows like an exponential is left out, and the method says so', () => {
    const answer = station('0.5', '  a: { average: n }\n  b: { average: exp(n) }')
    expect(answer?.measures.b).toBeUndefined()
    expect(answer?.method).toContain('No bound is known for "exp"')
  })
  test('an overloaded station has no answer', () => expect(station('1.5', '  a: { average: n }')).toBeUndefined())
  test('a share list adds up to 1', () => {
    const all = station('0.9', '  a: { distribution: n }')?.measures.a
    if (all === undefined || !('points' in all)) throw new Error('no points')
    expect(all.points.reduce((sum, [, share]) => sum + share, 0)).toBeCloseTo(1, 14)
    expect(all.points.slice(0, 4).map(([value]) => value)).toEqual([0, 1, 2, 3])
    expect(Math.abs(all.points[10][1] / (0.1 * 0.9 ** 10) - 1)).toBeLessThan(1e-14)
  })
})

describe('levels and phases', () => {
  test('loads of three in one go: mean r(1 + 3)/(2(1 - r)), Gross and Harris 1998 (from memory)', () =>
    holds(
      unboundedAnswer(`
state: { n: { from: 0, start: 0 } }
transitions:
  dock: { rate: 0.3, then: { n: n + 3 } }
  unload: { when: n > 0, rate: 1, then: { n: n - 1 } }
measures: { a: { average: n }, idle: { share: n == 0 } }`),
      'a',
      18,
    ))

  // Pollaczek and Khinchine: L = r + r²(1 + 1/k) / (2(1 - r)) for a service of k equal stages.
  test.each([
    { load: 0.9, stages: 3 },
    { load: 0.999, stages: 2 },
    { load: 0.7, stages: 60 },
  ])('load $load, service in $stages stages', ({ load, stages }) =>
    holds(
      unboundedAnswer(`
state: { n: { from: 0, start: 0 }, stage: { from: 0, to: ${stages - 1}, start: 0 } }
transitions:
  enter: { rate: ${load}, then: { n: n + 1 } }
  next: { when: n > 0 and stage < ${stages - 1}, rate: ${stages}, then: { stage: stage + 1 } }
  leave: { when: n > 0 and stage == ${stages - 1}, rate: ${stages}, then: { n: n - 1, stage: 0 } }
measures: { a: { average: n } }`),
      'a',
      load + (load * load * (1 + 1 / stages)) / (2 * (1 - load)),
      3e-11, // at load 0.999 the formula itself, in doubles, loses three digits to 1 - load
    ),
  )

  test('a count with two ends', () => {
    // Detailed balance by hand: up 3/8 a step above 0; from 0 down to -1 by 0.2/0.9, then 2/9 a step.
    const above = 3 / 8 / (1 - 3 / 8)
    const below = 2 / 9 / (1 - 2 / 9)
    const answer = unboundedAnswer(`
state: { n: { start: 0 } }
transitions:
  up: { rate: "if(n >= 0, 0.3, 0.9)", then: { n: n + 1 } }
  down: { rate: "if(n > 0, 0.8, 0.2)", then: { n: n - 1 } }
measures: { zero: { share: n == 0 }, below: { share: n < 0 } }`)
    holds(answer, 'zero', 1 / (1 + above + below))
    holds(answer, 'below', below / (1 + above + below))
  })

  test('a queue in steps: up 0.3, down 0.5, else it stays', () => {
    const answer = unboundedAnswer(
      `
remainder: stay
state: { n: { from: 0, start: 0 }, lamp: { from: 0, to: 1, start: 0 } }
transitions:
  up: { probability: 0.3, then: { n: n + 1, lamp: 1 - lamp } }
  down: { when: n > 0, probability: 0.5, then: { n: n - 1 } }
measures: { mean: { average: n }, lit: { share: lamp == 1 }, ups: { frequency: up } }`,
      'discrete',
    )
    holds(answer, 'mean', 1.5)
    holds(answer, 'lit', 0.5)
    holds(answer, 'ups', 0.3)
  })

  const rate = fc.integer({ min: 1, max: 40 }).map((each) => each / 10)
  const phases = fc.integer({ min: 2, max: 4 })
  const random = phases.chain((m) =>
    fc.record({
      m: fc.constant(m),
      up: fc.array(rate, { minLength: m, maxLength: m }),
      down: fc.array(rate, { minLength: m, maxLength: m }),
      turn: fc.array(rate, { minLength: m, maxLength: m }),
      jump: fc.integer({ min: 1, max: 3 }),
    }),
  )
  test('random models agree with a long truncation solved by plain elimination, within their bounds', () => {
    let solved = 0
    fc.assert(
      fc.property(random, ({ m, up, down, turn, jump }) => {
        // Phases turn in a ring; twice as fast down as the mean rise, so that 400 counts are enough for the oracle.
        const rise = up.map((each) => each / (4 * jump))
        const fall = down.map((each) => each + 4)
        const arms = turn.map(
          (each, i) => `  turn${i}: { when: s == ${i}, rate: ${each}, then: { s: ${(i + 1) % m} } }`,
        )
        const moves = rise.flatMap((each, i) => [
          `  up${i}: { when: s == ${i}, rate: ${each}, then: { n: n + ${jump} } }`,
          `  down${i}: { when: s == ${i} and n > 0, rate: ${fall[i]}, then: { n: n - 1 } }`,
        ])
        const answer = unboundedAnswer(`
state: { n: { from: 0, start: 0 }, s: { from: 0, to: ${m - 1}, start: 0 } }
transitions:
${[...arms, ...moves].join('\n')}
measures: { mean: { average: n }, square: { average: n^2 * (s + 1) }, last: { share: s == ${m - 1} and n > 2 }, rises: { frequency: up0 } }`)
        const oracle = truncated({ m, rise, fall, turn, jump, counts: 160 })
        for (const [name, expected] of Object.entries(oracle)) {
          const { value, errorBound } = numberIn(answer, name)
          expect(Math.abs(value - expected)).toBeLessThanOrEqual(errorBound + 1e-13 * Math.abs(expected))
          expect(errorBound).toBeLessThanOrEqual(1e-11 * Math.abs(expected))
        }
        solved++
      }),
      { seed: 11, numRuns: 25 },
    )
    expect(solved).toBe(25)
  })
})

interface RingModel {
  m: number
  rise: number[]
  fall: number[]
  turn: number[]
  jump: number
  counts: number
}

/** Means by elimination of the states from the top, one after the other (Grassmann, Taksar and Heyman 1985), dense. */
function truncated({ m, rise, fall, turn, jump, counts }: RingModel): Record<string, number> {
  const size = counts * m
  const a = new Float64Array(size * size)
  for (let n = 0; n < counts; n++) {
    for (let s = 0; s < m; s++) {
      const from = n * m + s
      a[from * size + n * m + ((s + 1) % m)] += turn[s]
      if (n + jump < counts) a[from * size + (n + jump) * m + s] += rise[s]
      if (n > 0) a[from * size + (n - 1) * m + s] += fall[s]
    }
  }
  for (let last = size - 1; last > 0; last--) {
    let out = 0
    const reach = Math.max(0, last - (jump + 2) * m)
    for (let j = reach; j < last; j++) out += a[last * size + j]
    for (let i = reach; i < last; i++) {
      a[i * size + last] /= out
      const share = a[i * size + last]
      if (share !== 0) for (let j = reach; j < last; j++) a[i * size + j] += share * a[last * size + j]
    }
  }
  const share = new Float64Array(size)
  share[0] = 1
  let total = 1
  for (let k = 1; k < size; k++) {
    for (let i = 0; i < k; i++) share[k] += share[i] * a[i * size + k]
    total += share[k]
  }
  const means = { mean: 0, square: 0, last: 0, rises: 0 }
  share.forEach((each, k) => {
    const n = Math.floor(k / m)
    const s = k % m
    means.mean += (each / total) * n
    means.square += (each / total) * n * n * (s + 1)
    if (s === m - 1 && n > 2) means.last += each / total
    if (s === 0) means.rises += (each / total) * rise[0]
  })
  return means
}

describe('networks', () => {
  const line = (measures: string) =>
    unboundedAnswer(`
state: { waiting: { index: { from: 1, to: 3 }, from: 0, start: 0 } }
transitions:
  enter: { rate: 1/2, then: { "waiting[1]": "waiting[1] + 1" } }
  move:
    each: { i: { from: 1, to: 2 } }
    when: waiting[i] > 0
    rate: i
    then: { "waiting[i]": "waiting[i] - 1", "waiting[i + 1]": "waiting[i + 1] + 1" }
  out: { when: "waiting[3] > 0", rate: "waiting[3]", then: { "waiting[3]": "waiting[3] - 1" } }
measures:
${measures}`)

  test('sums over stations are taken station by station', () => {
    // Loads 1/2 and 1/4, then a Poisson count of mean 1/2 (Jackson 1963).
    const answer = line(`
  all: { average: "sum(i, 1, 3, waiting[i])" }
  leaving: { frequency: out }
  moves: { frequency: "move[1] + 3 * move[2]" }
  stay: { ratio: ["sum(i, 1, 3, waiting[i])", enter] }`)
    holds(answer, 'all', 1 + 1 / 3 + 1 / 2)
    holds(answer, 'leaving', 0.5)
    holds(answer, 'moves', 2)
    holds(answer, 'stay', 2 * (1 + 1 / 3 + 1 / 2))
  })
  test('conditions and products over stations are taken jointly', () => {
    const answer = line(`
  empty: { share: "waiting[1] == 0 and waiting[3] == 0" }
  product: { average: "waiting[1] * waiting[2]" }
  both: { quantile: "waiting[1] + waiting[2]", level: 0.9 }`)
    holds(answer, 'empty', 0.5 * Math.exp(-0.5))
    holds(answer, 'product', 1 / 3)
    // P(sum <= k) = (3/8) Σ_{i<=s} 2^-i 4^-(s-i); 0.8203 at 2, 0.9082 at 3.
    expect(numberIn(answer, 'both')).toEqual({ value: 3, errorBound: 0 })
  })
})
