export type Verdict = 'agrees' | 'disagrees' | 'undecided'

/** What a reader is told: the first one of a list is the cause. */
export interface Finding {
  readonly code: FindingCode
  /** One plain sentence. */
  readonly says: string
  /** The numbers behind it. */
  readonly evidence: string
  /** The next action. */
  readonly next: string
  readonly transition?: string
  readonly states?: readonly unknown[]
  readonly constant?: string
}

export type FindingCode =
  | 'claim-off'
  | 'simulation-off'
  | 'harmless-difference'
  | 'too-short'
  | 'bias-left'
  | 'batches-short'
  | 'periodic'
  | 'start-dependent'
  | 'absorbing'
  | 'slow-mixing'
  | 'rare-states'
  | 'balanced-drift'
  | 'outward-drift'
  | 'explosive'
  | 'one-way'
  | 'open-class'

export interface MeasureComparison {
  readonly verdict: Verdict
  /** Simulated minus exact, in the measure's unit. */
  readonly difference: number
  /** The difference that matters, in the measure's unit (absolute). */
  readonly tolerance: number
  /** Of the hypothesis that simulation and exact value have the same long-run value; for this measure alone. */
  readonly pValue: number
}

export interface ClaimComparison {
  readonly verdict: Verdict
  readonly claimed: number
  /** The exact value; null where there is none (then the simulation judges). */
  readonly exact: number | null
  /** Absolute, in the measure's unit. */
  readonly tolerance: number
  readonly source?: string
}

export interface Comparison {
  readonly verdict: Verdict | 'no steady state'
  readonly measures: Readonly<Record<string, MeasureComparison>>
  readonly claims: Readonly<Record<string, ClaimComparison>>
  readonly findings: readonly Finding[]
}
