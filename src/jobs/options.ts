/** What a job may be told from outside; each overrides the scenario's `simulation` key of the same name. */
export interface JobOptions {
  /** Constants overridden: `--set doors=30`. */
  readonly set?: ReadonlyMap<string, string>
  readonly seed?: string
  readonly workers?: number
  readonly replications?: number
  /** Time units that each replication observes. */
  readonly runLength?: number
  /** Time units deleted, `auto`, or the name of a rule. */
  readonly warmUp?: number | string
  /** In (0, 1). */
  readonly confidence?: number
  readonly tolerance?: { readonly kind: 'absolute' | 'relative'; readonly value: number }
  readonly maxStates?: number
  readonly maxMemoryBytes?: number
  readonly timeLimitSeconds?: number
  /** `solve --states`. */
  readonly states?: boolean
  readonly signal?: AbortSignal
  readonly onProgress?: (progress: Progress) => void
}

export interface Progress {
  readonly stage: 'reading' | 'exploring' | 'structure' | 'solving' | 'pilot' | 'simulating' | 'comparing'
  readonly done?: number
  /** Undefined where it is not known beforehand. */
  readonly of?: number
  /** What is counted: states, events. */
  readonly unit?: string
}
