import type { Fraction } from '../numbers/fraction.js'

/**
 * What is known of the long run of a model whose states can't be listed. Plain data (it survives a structured clone).
 * `proved` only where the program checked every hypothesis of the theorem that `basis` names.
 */
export interface Classification {
  /**
   * As seen from the start. `positive recurrent`: it settles with certainty in a class that has a steady state;
   * `mixed`: it does so with a probability between 0 and 1.
   */
  readonly recurrence: Recurrence
  readonly grade: 'proved' | 'indicated' | 'open'
  /** One sentence that names the theorem (author, year), or says what is missing. */
  readonly basis: string
  /** "Neuts 1981". Absent where nothing decided. */
  readonly theorem?: string
  /** The hypotheses of the theorem as they were checked, one sentence each. */
  readonly checked: readonly string[]
  /** Infinitely many events in finite time. Absent: the events don't pile up, or it was not decided. */
  readonly explosive?: boolean
  /** True where it is proved that no steady state exists although null recurrent and transient were not told apart. */
  readonly noSteadyState?: boolean
  /** Closed classes that the start can reach, as far as known. `size` null where infinite, `period` null where unknown. */
  readonly closedClasses: readonly CountableClass[]
  /** Mean drift of each unbounded part, per time unit (per step in discrete time). */
  readonly drift?: readonly Drift[]
  /** How the model moves away, for `divergence.predictions`: `speed_<variable>`, `growth_<variable>`, `returns`, … */
  readonly growth?: readonly Prediction[]
  /** The form that was recognised, for the solver. */
  readonly structure?: CountableStructure
  readonly remedies: readonly Remedy[]
}

export type Recurrence = 'positive recurrent' | 'null recurrent' | 'transient' | 'mixed' | 'undetermined'

export interface CountableClass {
  readonly size: number | null
  readonly period: number | null
}

export interface Drift {
  /** The unbounded element, or elements: `backlog`, `waiting[1]`. */
  readonly of: string
  /** Where it is met: `far out`, `far below`, `inside`, `along a`. */
  readonly where: string
  /** Per time unit. */
  readonly value: number
  /** Absent where doubles had to do. */
  readonly exact?: Fraction
}

export interface Prediction {
  /** `speed_backlog`, `growth_backlog`, `returns`. */
  readonly name: string
  readonly value: number
  readonly exact?: Fraction
  /** Only the mean has this limit, not the path itself. */
  readonly inMean?: true
  /** "limit of backlog(t) / t". */
  readonly means: string
  /** "Neuts 1981", "Harrison 1985 (from memory)". */
  readonly source: string
}

/** The nearest value of a constant at which the class changes, the others as they are. */
export interface Remedy {
  readonly constant: string
  readonly now: number
  /** Equal to `now` at exact balance. */
  readonly threshold: number
  readonly exact?: Fraction
  readonly steadyWhen: 'below' | 'above'
}

export type CountableStructure = LevelStructure | BirthDeath | OpenNetwork | QuarterPlane | LatticeWalk | OtherStructure

/**
 * A quasi-birth-death process: finitely many boundary states, then levels 0, 1, 2, … of the same m phases. Level k + 1
 * is reached from level k only, and from level 0 the way down leads into the boundary. All states belong to one closed
 * class. In discrete time the rates are probabilities of one step. Moves that leave the state as it is are left out
 * everywhere, so no diagonal is used.
 */
export interface LevelStructure {
  readonly form: 'levels'
  readonly time: 'continuous' | 'discrete'
  /** Index of the unbounded element in the state. */
  readonly element: number
  /** State vectors of the boundary. */
  readonly boundary: readonly (readonly number[])[]
  /** State vectors of level 0, one a phase; `stateAt` makes those of the other levels. */
  readonly phases: readonly (readonly number[])[]
  /** Length m: what the unbounded element gains from one level to the next in that phase (negative below a two-sided model). */
  readonly levelStep: readonly number[]
  /** m×m row-major, from row to column: to the next level, within the level (diagonal 0), to the level before. */
  readonly up: RateMatrix
  readonly local: RateMatrix
  readonly down: RateMatrix
  /** Between boundary states, from the boundary to level 0, from level 0 to the boundary: indices as in the lists above. */
  readonly insideBoundary: readonly RateArc[]
  readonly boundaryUp: readonly RateArc[]
  readonly boundaryDown: readonly RateArc[]
  /** Where the unbounded element moves by one at most and there are no phases besides it. */
  readonly birthDeath?: BirthDeath
}

export interface RateMatrix {
  readonly exact: readonly Fraction[]
  readonly value: Float64Array
}

export interface RateArc {
  readonly from: number
  readonly to: number
  readonly exact: Fraction
  readonly value: number
}

/** The state of a phase at a level of a `LevelStructure`. */
export function stateAt(structure: LevelStructure, level: number, phase: number): number[] {
  const state = [...structure.phases[phase]]
  state[structure.element] += level * structure.levelStep[phase]
  return state
}

/**
 * A birth-death process on first, first + 1, …, without an upper end; all its states are one closed class. In discrete
 * time the rates are probabilities of one step, the rest stays.
 */
export interface BirthDeath {
  readonly form: 'birth-death'
  readonly time: 'continuous' | 'discrete'
  /** Index of the unbounded element. */
  readonly element: number
  /** The state vector of `first`; the other elements never change in the class. */
  readonly state: readonly number[]
  /** Lowest state of the closed class (where `outward` is -1: the count is minus the element's value). */
  readonly first: number
  /** Value of the element at count n is n × outward. */
  readonly outward: 1 | -1
  /** Rates at first, first + 1, … up to `beyond` - 1; the death rate at `first` is 0. */
  readonly birthBelow: readonly Fraction[]
  readonly deathBelow: readonly Fraction[]
  /** The first count from which on the rates are `birth(n)` and `death(n)`. */
  readonly beyond: number
  readonly birth: RationalFunction
  readonly death: RationalFunction
}

/** Σ numerator[k] n^k / Σ denominator[k] n^k, of a count n; without common factors that matter, both in exact fractions. */
export interface RationalFunction {
  readonly numerator: readonly Fraction[]
  readonly denominator: readonly Fraction[]
}

/** An open network in product form (Jackson 1957, 1963): station i holds the count of `element`, independent of the others. */
export interface OpenNetwork {
  readonly form: 'network'
  readonly time: 'continuous'
  readonly stations: readonly NetworkStation[]
  /** K×K row-major: share of departures of i that go to j. */
  readonly routing: readonly Fraction[]
}

export interface NetworkStation {
  readonly element: number
  /** From outside, per time unit. */
  readonly arrivals: Fraction
  /** By the traffic equations: from outside and from all stations. */
  readonly throughput: Fraction
  /** Departure rate at counts 0 … beyond - 1, then `service(n)`. */
  readonly serviceBelow: readonly Fraction[]
  readonly beyond: number
  readonly service: RationalFunction
  readonly recurrence: 'positive recurrent' | 'critical' | 'overloaded'
}

/** Two unbounded counts whose rates depend only on which of them is 0. */
export interface QuarterPlane {
  readonly form: 'quarter-plane'
  readonly time: 'continuous' | 'discrete'
  readonly elements: readonly [number, number]
  /** Moves inside, along the first axis (second count 0), along the second axis, at the corner. */
  readonly inside: readonly LatticeMove[]
  readonly alongFirst: readonly LatticeMove[]
  readonly alongSecond: readonly LatticeMove[]
  readonly corner: readonly LatticeMove[]
}

export interface LatticeMove {
  readonly jump: readonly number[]
  readonly rate: Fraction
}

/** A walk on Z^d that moves in the same way everywhere. */
export interface LatticeWalk {
  readonly form: 'walk'
  readonly time: 'continuous' | 'discrete'
  readonly elements: readonly number[]
  readonly moves: readonly LatticeMove[]
}

/** Recognised, but with no exact solution to build on; `drift` then bounds what a truncation cuts off, where there is one. */
export interface OtherStructure {
  readonly form: 'other'
  readonly time: 'continuous' | 'discrete'
  /** Unbounded elements. */
  readonly elements: readonly number[]
  readonly certificate?: DriftCertificate
}

/**
 * Proof of a steady state with a bound on its mass: V ≥ 0, the mean change of V per time unit is at most -`decrease`
 * outside a finite set and at most `increase` in it (Foster 1953; Meyn and Tweedie 1993).
 */
export interface DriftCertificate {
  /** V = Σ weights[k] × |state[elements[k]]| ^ power, with `base` instead: V = base ^ Σ …. */
  readonly weights: readonly Fraction[]
  readonly power: 1 | 2
  /** The finite set: Σ weights × |values| below this. */
  readonly within: Fraction
  readonly decrease: Fraction
  readonly increase: Fraction
}
