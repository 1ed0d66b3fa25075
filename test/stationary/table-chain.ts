import type { Chain } from '../../src/chain/chain.js'
import { joinArcs } from '../../src/chain/joined-arcs.js'
import { structureOf } from '../../src/chain/structure.js'
import type { CompiledMeasure, StateValue, TableModel } from '../../src/model/model.js'
import {
  absolute,
  equal,
  type Fraction,
  fractionOfDouble,
  fractionOfText,
  toNumber,
} from '../../src/numbers/fraction.js'
import { type SolveOptions, solve } from '../../src/stationary/solve.js'

/** A move with its rate or probability: a double that is meant exactly, a text such as `1/3`, or a fraction. */
export type Move = readonly [from: number, to: number, rate: number | string | Fraction]

export const exactly = (rate: Move[2]): Fraction => {
  if (typeof rate === 'object') return rate
  const value = typeof rate === 'number' ? fractionOfDouble(rate) : fractionOfText(rate)
  if (value === undefined) throw new Error(`${rate} is no number`)
  return value
}

/** A chain by table, built by hand, as the reader of scenarios would hand it on. */
export function tableChain(
  time: Chain['time'],
  size: number,
  moves: readonly Move[],
  { start = 0, measures = [] }: { start?: number; measures?: readonly CompiledMeasure[] } = {},
): { model: TableModel; chain: Chain } {
  const sorted = moves
    .map(([from, to, rate]) => ({ from, to, value: exactly(rate) }))
    .sort((a, b) => a.from - b.from || a.to - b.to)
  const states = Array.from({ length: size }, (_, k) => `s${k}`)
  const rowStart = new Int32Array(size + 1)
  for (const { from } of sorted) rowStart[from + 1]++
  for (let i = 0; i < size; i++) rowStart[i + 1] += rowStart[i]
  const rate = Float64Array.from(sorted, ({ value }) => toNumber(value))
  const rateError = Float64Array.from(sorted, ({ value }, k) =>
    equal(fractionOfDouble(rate[k]), value) ? 0 : toNumber(absolute(value)) * 2 ** -53,
  )
  const chain: Chain = {
    time,
    size,
    start,
    width: 0,
    values: new Int32Array(0),
    elements: [],
    names: states,
    rowStart,
    target: Int32Array.from(sorted, ({ to }) => to),
    rate,
    rateError,
    label: new Int32Array(sorted.length).fill(-1),
  }
  const model: TableModel = {
    kind: 'table',
    scenario: undefined as unknown as TableModel['scenario'], // the solver reads nothing of the file
    title: 'a chain by table',
    time,
    unit: 'step',
    measures,
    states,
    start,
    entries: sorted,
  }
  return { model, chain }
}

/** A value for each state of a table; exact where the values are doubles. */
export const valueByState = (values: readonly number[]): StateValue => ({
  valueOf: (state) => values[state[0]],
  errorOf: () => 0,
  exactOf: (state) => fractionOfDouble(values[state[0]]),
})

export const averageOf = (name: string, values: readonly number[]): CompiledMeasure => ({
  name,
  kind: 'average',
  of: { kind: 'average', value: valueByState(values) },
})

export function solveTable(
  time: Chain['time'],
  size: number,
  moves: readonly Move[],
  options: { start?: number; measures?: readonly CompiledMeasure[] } & SolveOptions = {},
) {
  const { model, chain } = tableChain(time, size, moves, options)
  const joined = joinArcs(chain)
  const structure = structureOf(chain, joined)
  return { model, chain, joined, structure, answer: solve(model, chain, joined, structure, options) }
}
