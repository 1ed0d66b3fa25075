import type { RunSettings } from './observations.js'
import type { Purpose } from './random-stream.js'

/**
 * What the replications of one run share: plain data over typed arrays that may lie in shared memory, so that a worker
 * can be handed it as it is. K columns of means over time, M columns of firings, R replications of B batches.
 */
export interface Task {
  readonly settings: RunSettings
  readonly purpose: Purpose
  readonly time: 'continuous' | 'discrete'
  /** Firings after which a replication stops; Infinity where there is no limit. */
  readonly maxEvents: number
  readonly output: Output
}

export interface EnumeratedTask extends Task {
  readonly start: number
  /** Length n + 1. */
  readonly rowStart: Int32Array
  /** These four: length arcs or n, see `AliasTables`. */
  readonly target: Int32Array
  readonly cutoff: Float64Array
  readonly alias: Int32Array
  readonly meanHolding: Float64Array
  /** n × K, row-major. */
  readonly values: Float64Array
  readonly valueColumns: number
  /** Length arcs: the row of `weights` that a firing counts with. */
  readonly group: Int32Array
  /** Groups × M, row-major. */
  readonly weights: Float64Array
  readonly firingColumns: number
  /** For each histogram the bin of each state, length n, and its values, ascending. */
  readonly bins: readonly Int32Array[]
  readonly binValues: readonly Float64Array[]
  /** Batches that the shares of each histogram are kept for; a divisor of B. */
  readonly binBatches: readonly number[]
  /** For each histogram R × its batches × its values: time, not yet divided by the batch length. */
  readonly binTimes: readonly Float64Array[]
}

export interface Output {
  /** R × B × (K + M): means over time, then firings per time unit; NaN where the replication stopped before. */
  readonly means: Float64Array
  /** Length R. */
  readonly events: Float64Array
  /** Length R: time from the start (warm-up included) at which a replication ran out of events; NaN where it did not. */
  readonly stoppedAt: Float64Array
  /** Length R: batches completed. */
  readonly completed: Int32Array
  /** Length R: share of its time that each replication has simulated. */
  readonly fraction: Float64Array
  /** Length R: state at the end; enumerated chains only. */
  readonly endState: Int32Array
  /** R × width: state at the end; models that are not enumerated only. */
  readonly endValues: Float64Array
}
