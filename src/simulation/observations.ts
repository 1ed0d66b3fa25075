/** What a simulation is asked to do. Everything that bears on the digits is here; workers do not. */
export interface RunSettings {
  /** A phrase. */
  readonly seed: string
  readonly replications: number
  /** Time units (steps) simulated and thrown away before each replication observes. Whole in discrete time. */
  readonly warmUp: number
  /** Time units (steps) that each replication observes. Whole in discrete time. */
  readonly runLength: number
  /**
   * Batches of equal length that each replication's observations are added up in. In discrete time a border may cut a
   * step: its time is split there, its firing is one of the later batch.
   */
  readonly batches: number
}

/** Time averages and frequencies over batches: replication r, batch b stands at r × batches + b. */
export interface Observations {
  readonly settings: RunSettings
  readonly measures: Readonly<Record<string, MeasureObservations>>
  /** Closed class in which each replication ended; -1 where none was entered. Absent where the chain is not enumerated. */
  readonly endedIn?: Int32Array
  /** The state vector at the end of each replication, R × width, for models that are not enumerated. */
  readonly finalStates?: Float64Array
  /** All firings, warm-up included; in discrete time all steps taken, staying included. */
  readonly events: number
  readonly workers: number
  /** Wall time of the simulation itself. */
  readonly seconds: number
  /** Replications that reached `maxEvents` before their time was over; absent where none did. */
  readonly stoppedEarly?: readonly StoppedReplication[]
}

export interface StoppedReplication {
  readonly replication: number
  /** Time units from the start, warm-up included, that were reached. */
  readonly time: number
  /** Batches that were completed; the numbers of the others are NaN. */
  readonly batches: number
}

export type MeasureObservations =
  | { readonly kind: 'mean'; readonly batchMeans: Float64Array }
  | { readonly kind: 'ratio'; readonly top: Float64Array; readonly bottom: Float64Array }
  /**
   * Share of time at each value: `values` ascending, length V; `shares` (R × batches) × V, row-major. `batches` is that
   * of the settings, or a divisor of it where so many shares would take too much memory (more than 2²³ of them).
   */
  | {
      readonly kind: 'histogram'
      readonly values: Float64Array
      readonly shares: Float64Array
      readonly batches: number
    }
