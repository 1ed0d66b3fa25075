/** What a simulation is asked to do. Everything that bears on the digits is here; workers do not. */
export interface RunSettings {
  /** A phrase. */
  readonly seed: string
  readonly replications: number
  /** Time units (steps) simulated and thrown away before each replication observes. */
  readonly warmUp: number
  /** Time units (steps) that each replication observes. */
  readonly runLength: number
  /** Batches of equal length that each replication's observations are added up in. */
  readonly batches: number
}

/** Time averages and frequencies over batches: replication r, batch b stands at r × batches + b. */
export interface Observations {
  readonly settings: RunSettings
  readonly measures: Readonly<Record<string, MeasureObservations>>
  /** Closed class in which each replication ended; -1 where none was entered. Absent where the chain is not enumerated. */
  readonly endedIn?: Int32Array
  /** First element of the state vector etc. at the end, R × width, for models that are not enumerated. */
  readonly finalStates?: Float64Array
  /** All firings, warm-up included. */
  readonly events: number
  readonly workers: number
  /** Wall time of the simulation itself. */
  readonly seconds: number
}

export type MeasureObservations =
  | { readonly kind: 'mean'; readonly batchMeans: Float64Array }
  | { readonly kind: 'ratio'; readonly top: Float64Array; readonly bottom: Float64Array }
  /**
   * Share of time at each value: `values` ascending, length V; `shares` (R × batches) × V, row-major.
   */
  | { readonly kind: 'histogram'; readonly values: Float64Array; readonly shares: Float64Array }
