import type { SolvedClass } from './solved-class.js'

/** The exact long-run answer of a chain and the bound on its error against the numbers as written in the file. */
export interface ExactAnswer {
  /** What was done, in words: "GTH elimination, 25 states". */
  readonly method: string
  readonly measures: Readonly<Record<string, ExactMeasure>>
  /**
   * Long-run share of time of each state from the scenario's start: length n, mixed over the closed classes by the
   * probabilities of ending there. Absent for an unbounded model.
   */
  readonly shares?: Float64Array
  /** Bound on the relative error of each share, one for all; Infinity where only the measures are bounded. */
  readonly sharesRelativeError?: number
  /** The solved classes that the start can reach, in the order of `Structure.closedClasses`; for dynamics. */
  readonly solved?: readonly SolvedClass[]
  /** The measures of each closed class on its own, in the order of `Structure.closedClasses`; where there are several. */
  readonly byClass?: readonly Readonly<Record<string, ExactMeasure>>[]
}

export type ExactMeasure =
  | { readonly value: number; readonly errorBound: number }
  | { readonly points: readonly (readonly [value: number, share: number])[]; readonly errorBound: number }
