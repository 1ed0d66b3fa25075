import type { Chain } from '../../src/chain/chain.js'
import type { CompiledMeasure, Functional, StateValue, TableModel } from '../../src/model/model.js'
import { fractionOfDouble } from '../../src/numbers/fraction.js'

/** A move with its rate or probability. */
export type Move = readonly [from: number, to: number, rate: number]

/** A chain by table as the rooms before would hand it on. */
export function handMadeChain(
  time: Chain['time'],
  size: number,
  moves: readonly Move[],
  measures: readonly CompiledMeasure[],
  start = 0,
): { model: TableModel; chain: Chain } {
  const sorted = [...moves].sort((a, b) => a[0] - b[0] || a[1] - b[1])
  const states = Array.from({ length: size }, (_, k) => `s${k}`)
  const rowStart = new Int32Array(size + 1)
  for (const [from] of sorted) rowStart[from + 1]++
  for (let i = 0; i < size; i++) rowStart[i + 1] += rowStart[i]
  const chain: Chain = {
    time,
    size,
    start,
    width: 0,
    values: new Int32Array(0),
    elements: [],
    names: states,
    rowStart,
    target: Int32Array.from(sorted, ([, to]) => to),
    rate: Float64Array.from(sorted, ([, , rate]) => rate),
    rateError: new Float64Array(sorted.length),
    label: new Int32Array(sorted.length).fill(-1),
  }
  const model: TableModel = {
    kind: 'table',
    scenario: undefined as unknown as TableModel['scenario'], // a chain is simulated without its file
    title: 'a chain by table',
    time,
    unit: time === 'discrete' ? 'step' : 'hour',
    measures,
    states,
    start,
    entries: sorted.map(([from, to, rate]) => ({ from, to, value: fractionOfDouble(rate) })),
  }
  return { model, chain }
}

export const byState = (values: readonly number[]): StateValue => ({
  valueOf: (state) => values[state[0]],
  errorOf: () => 0,
  exactOf: (state) => fractionOfDouble(values[state[0]]),
})

export const averageOf = (name: string, values: readonly number[]): CompiledMeasure => ({
  name,
  kind: 'average',
  of: { kind: 'average', value: byState(values) },
})

export const movesOf = (name: string, from?: number, to?: number): CompiledMeasure => ({
  name,
  kind: 'frequency',
  of: { kind: 'moves', from, to },
})

export const ratioOf = (name: string, top: Functional, bottom: Functional): CompiledMeasure => ({
  name,
  kind: 'ratio',
  top,
  bottom,
})

export const distributionOf = (name: string, values: readonly number[]): CompiledMeasure => ({
  name,
  kind: 'distribution',
  value: byState(values),
})

/** A ring with steps forward, back and seven ahead at uneven rates, and one measure of each kind. */
export function ringChain(size: number, time: Chain['time']) {
  const moves = Array.from({ length: size }, (_, i): Move[] => {
    const rates = [0, 1, 2].map((k) => 0.2 + 0.1 * ((i * 3 + k * 5) % 7))
    const total = time === 'discrete' ? rates.reduce((sum, rate) => sum + rate, 0) : 1
    return [
      [i, (i + 1) % size, rates[0] / total],
      [i, (i + size - 1) % size, rates[1] / total],
      [i, (i + 7) % size, rates[2] / total],
    ]
  }).flat()
  const levels = Array.from({ length: size }, (_, i) => i % 10)
  return handMadeChain(time, size, moves, [
    averageOf('level', levels),
    movesOf('entries', undefined, 0),
    ratioOf('per_entry', { kind: 'average', value: byState(levels) }, { kind: 'moves', to: 0 }),
    distributionOf('spread', levels),
  ])
}
