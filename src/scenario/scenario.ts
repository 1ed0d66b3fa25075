import type { Fraction } from '../numbers/fraction.js'
import type { Expression, Spot } from './expression.js'

/** A scenario file, read and checked: plain data (it survives a structured clone, so a worker can be handed it). */
export interface Scenario {
  readonly source: Source
  readonly title: string
  readonly time: 'continuous' | 'discrete'
  /** Label of one time unit, of one step in discrete time. */
  readonly unit: string
  /** After `--set`. A list is counted from 1. */
  readonly constants: ReadonlyMap<string, Fraction | readonly Fraction[]>
  readonly quantities: ReadonlyMap<string, Expression>
  readonly body: VariablesBody | TableBody
  readonly measures: readonly Measure[]
  readonly claims: readonly Claim[]
  readonly simulation: SimulationSettings
  readonly expect?: Expectation
}

export interface Source {
  /** The name as it was given on the command line. */
  readonly file: string
  /** Of the bytes of the file, hexadecimal. */
  readonly sha256: string
  readonly text: string
  /** Constants overridden from outside, as written there. */
  readonly overrides: ReadonlyMap<string, string>
}

export type Expectation = 'positive recurrent' | 'null recurrent' | 'transient' | 'mixed' | 'explosive'

export interface VariablesBody {
  readonly kind: 'variables'
  readonly variables: readonly StateVariable[]
  readonly transitions: readonly TransitionRule[]
  /** Discrete time: what the rest of the probability does. `refuse`: there may be no rest. */
  readonly remainder: 'stay' | 'refuse'
}

export interface StateVariable {
  readonly name: string
  /** An array: its elements are counted from `from` to `to`. */
  readonly index?: { readonly from: number; readonly to: number }
  /** Undefined where the variable has no lower bound. */
  readonly from?: number
  readonly to?: number
  /** One value an element (one alone where it is no array). */
  readonly start: readonly number[]
  readonly at: Spot
}

export interface TransitionRule {
  readonly name: string
  /** Outermost first; a later one may use an earlier one's name. */
  readonly each: readonly { readonly name: string; readonly from: Expression; readonly to: Expression }[]
  readonly when: Expression
  /** Rate in continuous time, probability in discrete time. */
  readonly rate: Expression
  /** Simultaneous: the right sides see the old state. */
  readonly then: readonly { readonly variable: string; readonly index?: Expression; readonly value: Expression }[]
  readonly at: Spot
}

export interface TableBody {
  readonly kind: 'table'
  readonly states: readonly string[]
  /** Index of the start state. */
  readonly start: number
  /** Off-diagonal and diagonal entries as written (a generator's diagonal has been checked and left out). */
  readonly entries: readonly TableEntry[]
}

export interface TableEntry {
  readonly from: number
  readonly to: number
  readonly value: Fraction
  /** Where it stands; in the matrix file for `matrix:`. */
  readonly at?: Spot
}

/** What a measure is about: an expression over the state, or (by table) a number for each state or a set of moves. */
export type Subject =
  | { readonly kind: 'expression'; readonly of: Expression }
  /** Value of each state, length number of states; what the file leaves out is 0. */
  | { readonly kind: 'states'; readonly values: readonly Fraction[] }
  /** Moves between states of a table; undefined: any. */
  | { readonly kind: 'moves'; readonly from?: number; readonly to?: number }

export type Side = { readonly kind: 'average' | 'frequency'; readonly of: Subject }

export type Measure = { readonly name: string; readonly at: Spot } & (
  | { readonly kind: 'average' | 'share' | 'frequency'; readonly of: Subject }
  | { readonly kind: 'ratio'; readonly top: Side; readonly bottom: Side }
  /** `level` in (0, 1). */
  | { readonly kind: 'quantile'; readonly of: Subject; readonly level: Fraction }
  | { readonly kind: 'distribution'; readonly of: Subject }
)

/** `absolute` in the measure's unit; `relative` as a share: 2 % is 1/50. */
export type Tolerance = { readonly kind: 'absolute' | 'relative'; readonly value: Fraction }

export interface Claim {
  /** The measure it is about. */
  readonly measure: string
  readonly value: Fraction
  /** As written: "0.115", "11.5 %". */
  readonly written: string
  /** Undefined: half a unit of the last written digit, which is `lastDigit`/2. */
  readonly tolerance?: Tolerance
  /** One unit of the last written digit of the value. */
  readonly lastDigit: Fraction
  readonly source?: string
  readonly at: Spot
}

/** As far as the file sets them; defaults are filled in by the job. */
export interface SimulationSettings {
  readonly seed?: string
  readonly replications?: number
  /** In time units. */
  readonly runLength?: number
  readonly warmUp?: 'auto' | number | string
  readonly confidence?: number
  readonly tolerance?: Tolerance
}
