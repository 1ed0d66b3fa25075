import type { Fraction } from '../numbers/fraction.js'
import type { Scenario } from '../scenario/scenario.js'

// Rooms further right may import this room but not `scenario`: what they need of it comes through here.
export type { Expression } from '../scenario/expression.js'
export type { Scenario, StateVariable, TransitionRule } from '../scenario/scenario.js'

/**
 * A checked scenario, compiled. `variables`: states are vectors of integers, moves are made by `expand`.
 * `table`: states are numbered and named, moves are listed.
 */
export type Model = VariablesModel | TableModel

interface ModelBase {
  readonly scenario: Scenario
  readonly title: string
  readonly time: 'continuous' | 'discrete'
  readonly unit: string
  readonly measures: readonly CompiledMeasure[]
}

export interface VariablesModel extends ModelBase {
  readonly kind: 'variables'
  /** Number of integers in a state: array elements count one each. */
  readonly width: number
  /** Length width: `occupied`, `waiting[1]`. */
  readonly elements: readonly string[]
  /** Length width: -Infinity and Infinity where there is no bound. */
  readonly lower: Float64Array
  readonly upper: Float64Array
  readonly start: Float64Array
  /** Every copy of every transition, in the order of the file; `stay` of `remainder: stay` is not among them. */
  readonly labels: readonly Label[]
  /** True where some transition's rate or guard can't be followed exactly in fractions (exp, log, sqrt, …). */
  readonly irrational: boolean
  /**
   * All that can fire in a state. `state` may be any array of integers of length width; it is not changed.
   * Fills `moves`; firings with rate 0 are left out. In discrete time the probabilities are checked to sum to 1 and
   * normalised; what `remainder: stay` leaves comes last with label -1.
   * @throws StillmarkError negative-rate, not-finite, probability-over-1, probabilities-off, outside-bounds,
   *   naming state and transition
   */
  expand(state: ArrayLike<number>, moves: Moves): void
  /** The same rates in exact fractions, undefined where a rate is irrational. Slow, for proofs and checks. */
  expandExactly(state: ArrayLike<number>): readonly ExactMove[]
  /** `{ occupied: 3, waiting: [0, 2] }` as text: `occupied 3, waiting 0 2`. For messages. */
  describe(state: ArrayLike<number>): string
}

export interface TableModel extends ModelBase {
  readonly kind: 'table'
  readonly states: readonly string[]
  readonly start: number
  /** As `TableBody.entries`, sorted by row and column, duplicates joined, zeros dropped; probabilities sum to 1. */
  readonly entries: readonly { readonly from: number; readonly to: number; readonly value: Fraction }[]
}

/** One copy of a transition: `move[1, 2]`. */
export interface Label {
  readonly transition: string
  readonly copy: readonly number[]
}

/** Growing buffers that `expand` fills; made by `newMoves(width)`. Entries beyond `count` mean nothing. */
export interface Moves {
  count: number
  /** Index into `labels`, -1 for the stay of `remainder: stay`. */
  label: Int32Array
  /** Rate or probability. */
  rate: Float64Array
  /** Bound on |rate - the rate of the numbers as written|. */
  rateError: Float64Array
  /** count × width, row-major. */
  next: Float64Array
}

export interface ExactMove {
  readonly label: number
  readonly rate: Fraction | undefined
  readonly next: readonly number[]
}

/** A value for each state: as compiled function (variables) or list (table). */
export type StateValue = {
  /** @returns the value in the state; `state` as in `expand`, or for a table an array holding the state's index. */
  readonly valueOf: (state: ArrayLike<number>) => number
  /** Bound on the error of that value against the numbers as written. */
  readonly errorOf: (state: ArrayLike<number>) => number
  /** Exact, undefined where irrational. */
  readonly exactOf: (state: ArrayLike<number>) => Fraction | undefined
}

/** A long-run mean: of a value over time, or of weighted firings per time unit. */
export type Functional =
  | { readonly kind: 'average'; readonly value: StateValue }
  /** Σ weight of each label over its firings; length `labels`. Constants are allowed as factors, so it is linear. */
  | { readonly kind: 'frequency'; readonly weights: Float64Array }
  /** Moves of a table. */
  | { readonly kind: 'moves'; readonly from?: number; readonly to?: number }

export type CompiledMeasure = { readonly name: string } & (
  | { readonly kind: 'average' | 'share' | 'frequency'; readonly of: Functional }
  | { readonly kind: 'ratio'; readonly top: Functional; readonly bottom: Functional }
  | { readonly kind: 'quantile'; readonly value: StateValue; readonly level: number }
  | { readonly kind: 'distribution'; readonly value: StateValue }
)
