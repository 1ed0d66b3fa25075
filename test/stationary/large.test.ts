import { describe, expect, test } from 'vitest'
import type { Chain } from '../../src/chain/chain.js'
import { joinArcs } from '../../src/chain/joined-arcs.js'
import { structureOf } from '../../src/chain/structure.js'
import { StillmarkError } from '../../src/errors/stillmark-error.js'
import type { CompiledMeasure, StateValue, VariablesModel } from '../../src/model/model.js'
import { type SolveOptions, solve } from '../../src/stationary/solve.js'

/** Stations in series with room for so many each: arrivals at the first, moves on while there is room, departures. */
function line(rooms: readonly number[], rate: (station: number) => number): Chain {
  const width = rooms.length
  const size = rooms.reduce((product, room) => product * (room + 1), 1)
  const values = new Int32Array(size * width)
  const stride = rooms.map((_, k) => rooms.slice(0, k).reduce((product, room) => product * (room + 1), 1))
  const rowStart = new Int32Array(size + 1)
  const target: number[] = []
  const rates: number[] = []
  for (let s = 0; s < size; s++) {
    const present = rooms.map((room, k) => Math.floor(s / stride[k]) % (room + 1))
    values.set(present, s * width)
    const move = (to: number, station: number) => {
      target.push(to)
      rates.push(rate(station))
    }
    if (present[0] < rooms[0]) move(s + stride[0], 0)
    for (let k = 0; k < width - 1; k++) {
      if (present[k] > 0 && present[k + 1] < rooms[k + 1]) move(s - stride[k] + stride[k + 1], k + 1)
    }
    if (present[width - 1] > 0) move(s - stride[width - 1], width)
    rowStart[s + 1] = target.length
  }
  return {
    time: 'continuous',
    size,
    start: 0,
    width,
    values,
    elements: rooms.map((_, k) => `station[${k + 1}]`),
    rowStart,
    target: Int32Array.from(target),
    rate: Float64Array.from(rates),
    rateError: new Float64Array(target.length),
    label: new Int32Array(target.length),
  }
}

const value = (of: (state: ArrayLike<number>) => number): StateValue => ({
  valueOf: of,
  errorOf: () => 0,
  exactOf: () => undefined,
})

const averages: CompiledMeasure[] = [
  { name: 'first', kind: 'average', of: { kind: 'average', value: value((state) => state[0]) } },
  { name: 'second', kind: 'average', of: { kind: 'average', value: value((state) => state[1]) } },
  {
    name: 'empty',
    kind: 'share',
    of: { kind: 'average', value: value((state) => (state[0] + state[1] === 0 ? 1 : 0)) },
  },
  { name: 'spread', kind: 'distribution', value: value((state) => Math.min(state[0], 3)) },
]

function solveLine(chain: Chain, options: SolveOptions = {}) {
  const joined = joinArcs(chain)
  // The solver reads nothing of a model but its measures, unless a tie has to be settled in fractions.
  const model = { kind: 'variables', measures: averages } as unknown as VariablesModel
  return solve(model, chain, joined, structureOf(chain, joined), options)
}

const bounded = (measure: unknown) => measure as { value: number; errorBound: number }

describe('a three-station line with 2,197 states, by elimination and, short of memory, by multilevel aggregation', () => {
  const chain = line([12, 12, 12], (station) => [1, 1.125, 1.25, 1.375][station])
  const eliminated = solveLine(chain)
  const levelled = solveLine(chain, { maxMemoryBytes: 2e6 })

  test('the methods are said', () => {
    expect(eliminated.method).toBe('sparse GTH elimination by nested dissection, 2,197 states')
    expect(levelled.method).toMatch(/^multilevel aggregation \(\d+ cycles\), 2,197 states$/)
  })

  test.each(['first', 'second', 'empty'])('both agree on "%s" within the sum of their bounds', (name) => {
    const one = bounded(eliminated.measures[name])
    const other = bounded(levelled.measures[name])
    expect(Math.abs(one.value - other.value)).toBeLessThanOrEqual(one.errorBound + other.errorBound)
    expect(one.errorBound).toBeLessThan(1e-14 * one.value)
    expect(other.errorBound).toBeLessThan(1e-10)
  })

  test('every share agrees to 1e-10 of itself', () => {
    eliminated.shares?.forEach((share, k) => {
      expect(Math.abs((levelled.shares?.[k] as number) - share)).toBeLessThanOrEqual(1e-10 * share)
    })
    expect(eliminated.sharesRelativeError).toBeLessThan(1e-8)
    expect(levelled.sharesRelativeError).toBe(Number.POSITIVE_INFINITY)
  })
})

describe('two desks of independent queues: product of the two truncated geometric laws, by hand', () => {
  // Each with room for 60, in at 1 and out at 2, so r = 1/2: mean r/(1 - r) - 61 r^61/(1 - r^61).
  const room = 60
  const size = (room + 1) ** 2
  const arcs: [number, number, number][] = []
  for (let a = 0; a <= room; a++) {
    for (let b = 0; b <= room; b++) {
      const s = a * (room + 1) + b
      if (a < room) arcs.push([s, s + room + 1, 1])
      if (a > 0) arcs.push([s, s - room - 1, 2])
      if (b < room) arcs.push([s, s + 1, 1])
      if (b > 0) arcs.push([s, s - 1, 2])
    }
  }
  const chain: Chain = {
    time: 'continuous',
    size,
    start: 0,
    width: 2,
    values: Int32Array.from({ length: 2 * size }, (_, k) =>
      k % 2 === 0 ? Math.floor(k / 2 / (room + 1)) : (k >> 1) % (room + 1),
    ),
    elements: ['first', 'second'],
    rowStart: Int32Array.from({ length: size + 1 }, (_, s) => {
      const at = arcs.findIndex(([from]) => from >= s)
      return at < 0 ? arcs.length : at
    }),
    target: Int32Array.from(arcs, (arc) => arc[1]),
    rate: Float64Array.from(arcs, (arc) => arc[2]),
    rateError: new Float64Array(arcs.length),
    label: new Int32Array(arcs.length),
  }
  const { measures, shares } = solveLine(chain)

  test('shares to 1e-12 of themselves, down to 2^-120', () => {
    const none = 0.5 / (1 - 2 ** -61)
    shares?.forEach((share, s) => {
      const [a, b] = [Math.floor(s / (room + 1)), s % (room + 1)]
      expect(Math.abs(share / (none * 2 ** -a * none * 2 ** -b) - 1)).toBeLessThan(1e-12)
    })
  })

  test('means within their bounds', () => {
    const { value: mean, errorBound } = bounded(measures.first)
    expect(Math.abs(mean - (1 - (61 * 2 ** -61) / (1 - 2 ** -61)))).toBeLessThanOrEqual(errorBound)
    expect(errorBound).toBeLessThan(1e-14)
  })
})

test('a chain that no method can hold in the memory allowed is refused, with what it would take', () => {
  try {
    solveLine(
      line([12, 12, 12], () => 1),
      { maxMemoryBytes: 1e5 },
    )
    throw new Error('not refused')
  } catch (error) {
    expect(error).toBeInstanceOf(StillmarkError)
    expect((error as StillmarkError).kind).toBe('limit')
    expect((error as StillmarkError).what).toMatch(/2,197 states would take [\d.]+ [MG]B of memory/)
  }
})
