import type { Comparison } from '../comparison/verdict.js'

/**
 * What `--json` prints: the contract with other programs. Each part is absent where the command does not make it.
 * A field is only ever added; a change of meaning is a new number in `format`.
 */
export interface StillmarkDocument {
  readonly format: `stillmark/${CommandName}/1`
  readonly scenario: ScenarioPart
  readonly structure?: StructurePart
  readonly exact?: ExactPart | null
  /** Why `exact` is null. */
  readonly exactAbsent?: string
  readonly simulation?: SimulationPart
  readonly comparison?: Comparison
  /** Of commands that compare nothing (`simulate`, `classify`, `solve`): what there is to say. */
  readonly findings?: Comparison['findings']
}

export type CommandName = 'check' | 'classify' | 'solve' | 'simulate'

export interface ScenarioPart {
  readonly title: string
  readonly file: string
  readonly sha256: string
}

export type Recurrence = 'positive recurrent' | 'null recurrent' | 'transient' | 'mixed' | 'undetermined'

/** A state as it is shown: a table's name, or the variables' values. */
export type ShownState = string | Readonly<Record<string, number | readonly number[]>>

export interface StructurePart {
  /** null where unbounded. */
  readonly states: number | null
  /** Distinct pairs (from, to), staying included; null where unbounded. */
  readonly transitions: number | null
  readonly recurrence: Recurrence
  readonly grade: 'proved' | 'indicated' | 'open'
  readonly basis: string
  readonly closedClasses: readonly {
    readonly size: number | null
    readonly period: number
    readonly reachedWith: number
    readonly states?: readonly ShownState[]
  }[]
  readonly transientStates: number | null
  /** Expected time until a closed class is entered. */
  readonly meanTimeToSettle: number | null
  readonly explosive?: boolean
  readonly drift?: unknown
  readonly growth?: unknown
}

export interface ExactPart {
  readonly method: string
  readonly measures: Readonly<
    Record<
      string,
      | { readonly value: number; readonly errorBound: number }
      | { readonly points: readonly (readonly [number, number])[]; readonly errorBound: number }
    >
  >
  /** `solve --states`: at most 100,000. */
  readonly distribution?: readonly (readonly [ShownState, number])[]
}

export interface SimulationPart {
  readonly seed: string
  readonly replications: number
  readonly workers: number
  /** Time units deleted before each replication observes, and the rule that chose it. */
  readonly warmUp: number
  readonly warmUpRule: string
  readonly runLength: number
  /** All firings, warm-up included. */
  readonly events: number
  /** Wall time of the simulation itself. */
  readonly seconds: number
  readonly measures: Readonly<Record<string, SimulatedMeasure>>
}

export interface SimulatedMeasure {
  readonly estimate?: number
  readonly points?: readonly (readonly [value: number, share: number, halfWidth: number])[]
  /** null where no honest interval can be given. */
  readonly halfWidth: number | null
  readonly confidence: number
  readonly method: string
}
