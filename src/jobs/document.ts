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
  readonly divergence?: DivergencePart
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
    /** null where it is not known. */
    readonly period: number | null
    /** null where it is not known. */
    readonly reachedWith: number | null
    readonly states?: readonly ShownState[]
  }[]
  readonly transientStates: number | null
  /** Expected time until a closed class is entered. */
  readonly meanTimeToSettle: number | null
  readonly explosive?: boolean
  /** The hypotheses of the theorem as they were checked. */
  readonly checked?: readonly string[]
  readonly drift?: readonly {
    readonly of: string
    readonly where: string
    readonly value: number
    readonly exact?: string
  }[]
  readonly growth?: readonly {
    readonly name: string
    readonly value: number
    readonly means: string
    readonly source: string
  }[]
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

/** What a model without steady state does instead, and what the simulation shows of it. */
export interface DivergencePart {
  readonly predictions: Readonly<Record<string, PredictionPart>>
  /** The nearest values of constants at which the class changes. */
  readonly remedies: readonly {
    readonly constant: string
    readonly now: number
    readonly threshold: number
    readonly steadyWhen: 'below' | 'above'
  }[]
}

export interface PredictionPart {
  readonly predicted: number
  /** null where it was not simulated. */
  readonly observed: number | null
  readonly halfWidth: number | null
  readonly verdict: 'agrees' | 'disagrees' | 'undecided'
  readonly inMean?: boolean
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
