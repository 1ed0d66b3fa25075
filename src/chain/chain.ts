/**
 * An enumerated chain. Rows are compressed: what leaves state i stands at rowStart[i] … rowStart[i + 1] - 1.
 * Arcs are kept as they fire, one a label, moves that leave the state as it is included; `joinArcs` makes the distinct pairs.
 * All arrays may lie in shared memory.
 */
export interface Chain {
  readonly time: 'continuous' | 'discrete'
  /** Number of states n. */
  readonly size: number
  /** Index of the start state. */
  readonly start: number
  /** Integers a state; 0 for a table. */
  readonly width: number
  /** n × width, row-major. */
  readonly values: Int32Array
  /** Names of the integers, length width. */
  readonly elements: readonly string[]
  /** Names of a table's states. */
  readonly names?: readonly string[]
  /** Length n + 1. */
  readonly rowStart: Int32Array
  readonly target: Int32Array
  /** Rate or probability, positive. */
  readonly rate: Float64Array
  /** Bound on the error of each rate against the numbers as written. */
  readonly rateError: Float64Array
  /** Index into the model's labels; -1 for staying (`remainder: stay`) and throughout for a table. */
  readonly label: Int32Array
}

/** Distinct pairs (from, to), sorted by `to` in each row, staying included. */
export interface JoinedArcs {
  readonly rowStart: Int32Array
  readonly target: Int32Array
  readonly rate: Float64Array
  readonly rateError: Float64Array
}

export interface Structure {
  /** Closed class of each state, -1 for a transient one. Length n. */
  readonly classOf: Int32Array
  readonly closedClasses: readonly ClosedClass[]
  /** Transient states, ascending. */
  readonly transientStates: Int32Array
  /** Distinct pairs (from, to), staying included. */
  readonly transitions: number
  /** Expected time from the start until a closed class is entered; 0 where the start is in one. */
  readonly meanTimeToSettle: number
}

export interface ClosedClass {
  /** Ascending. */
  readonly states: Int32Array
  /** 1 in continuous time. */
  readonly period: number
  /** Probability of ending here from the start. */
  readonly reachedWith: number
  readonly reachedWithError: number
}
