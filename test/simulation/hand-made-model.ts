import type { CompiledMeasure, VariablesModel } from '../../src/model/model.js'

export interface HandMadeMove {
  readonly label: number
  readonly rate: number
  readonly next: readonly number[]
}

/** A model by variables whose moves are given by a plain function; for kernels that only expand. */
export function handMadeModel(
  time: VariablesModel['time'],
  start: readonly number[],
  transitions: readonly string[],
  movesFrom: (state: ArrayLike<number>) => readonly HandMadeMove[],
  measures: readonly CompiledMeasure[],
): VariablesModel {
  return {
    kind: 'variables',
    scenario: undefined as unknown as VariablesModel['scenario'], // one worker compiles nothing
    title: 'a model made by hand',
    time,
    unit: 'hour',
    measures,
    width: start.length,
    elements: start.map((_, k) => `x${k}`),
    lower: new Float64Array(start.length).fill(Number.NEGATIVE_INFINITY),
    upper: new Float64Array(start.length).fill(Number.POSITIVE_INFINITY),
    start: Float64Array.from(start),
    labels: transitions.map((transition) => ({ transition, copy: [] })),
    irrational: false,
    expand: (state, moves) => {
      const found = movesFrom(state).filter(({ rate }) => rate > 0)
      moves.count = found.length
      found.forEach(({ label, rate, next }, k) => {
        moves.label[k] = label
        moves.rate[k] = rate
        next.forEach((x, j) => {
          moves.next[k * start.length + j] = x
        })
      })
    },
    expandExactly: () => [],
    describe: (state) => Array.from(state).join(' '),
  }
}

/** Comes at rate `arrivals`, goes at rate `services`; unbounded. Measures: number present, share idle, firings. */
export const singleDesk = (arrivals: number, services: number) =>
  handMadeModel(
    'continuous',
    [0],
    ['come', 'go'],
    ({ 0: n }) => [
      { label: 0, rate: arrivals, next: [n + 1] },
      { label: 1, rate: n > 0 ? services : 0, next: [n - 1] },
    ],
    [
      { name: 'present', kind: 'average', of: { kind: 'average', value: byFirst((n) => n) } },
      { name: 'idle', kind: 'share', of: { kind: 'average', value: byFirst((n) => (n === 0 ? 1 : 0)) } },
      { name: 'comings', kind: 'frequency', of: { kind: 'frequency', weights: Float64Array.of(1, 0) } },
      { name: 'goings', kind: 'frequency', of: { kind: 'frequency', weights: Float64Array.of(0, 1) } },
      {
        name: 'stay_time',
        kind: 'ratio',
        top: { kind: 'average', value: byFirst((n) => n) },
        bottom: { kind: 'frequency', weights: Float64Array.of(1, 0) },
      },
      { name: 'spread', kind: 'distribution', value: byFirst((n) => n) },
    ],
  )

export const byFirst = (f: (first: number) => number) => ({
  valueOf: (state: ArrayLike<number>) => f(state[0]),
  errorOf: () => 0,
  exactOf: () => undefined,
})
