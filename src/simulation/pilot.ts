import type { Chain } from '../chain/chain.js'
import type { Model } from '../model/model.js'
import type { StoppedReplication } from './observations.js'
import { type RunOptions, replicate } from './replications.js'
import { columnOf, stoppedOf } from './simulate.js'

export interface PilotSettings {
  readonly seed: string
  readonly replications: number
  /** Time units (whole steps) that each replication is followed for, from the start. */
  readonly length: number
  /** Equal intervals that its time is cut into. */
  readonly points: number
}

/** How each measure runs from the start, without any warm-up: what a warm-up and a run length are chosen by. */
export interface PilotSeries {
  readonly settings: PilotSettings
  /** Time units an interval. */
  readonly interval: number
  readonly measures: Readonly<Record<string, MeasureSeries>>
  /** All firings. */
  readonly events: number
  /** Replications that reached `maxEvents` before their time was over, with the intervals completed as `batches`. */
  readonly stoppedEarly?: readonly StoppedReplication[]
}

/**
 * Means over each interval, replications × points, row-major; NaN where a replication stopped before. For a quantile or
 * a distribution: the mean of the value.
 */
export type MeasureSeries =
  | { readonly kind: 'mean'; readonly means: Float64Array }
  | { readonly kind: 'ratio'; readonly top: Float64Array; readonly bottom: Float64Array }

/** Events of a pilot run in all, where the options do not say. */
const pilotEvents = 4e6

/**
 * A short run on draws of its own, which the run itself does not see again.
 * @param options `maxEvents` is of each replication; by default 4,000,000 in all, shared equally
 * @throws as `simulate`
 */
export async function simulatePilot(
  model: Model,
  chain: Chain | undefined,
  settings: PilotSettings,
  options: RunOptions = {},
): Promise<PilotSeries> {
  const { seed, replications, length, points } = settings
  const maxEvents = options.maxEvents ?? Math.ceil(pilotEvents / replications)
  const run = await replicate(
    model,
    chain,
    { seed, replications, warmUp: 0, runLength: length, batches: points },
    { purpose: 'pilot', distributionsAs: 'means' },
    { ...options, maxEvents },
  )
  const stoppedEarly = stoppedOf(run)
  return {
    settings,
    interval: length / points,
    measures: Object.fromEntries(
      run.columns.measures.flatMap((measure): [string, MeasureSeries][] => {
        if (measure.kind === 'mean') return [[measure.name, { kind: 'mean', means: columnOf(run, measure.column) }]]
        if (measure.kind === 'histogram') return []
        const { top, bottom } = measure
        return [[measure.name, { kind: 'ratio', top: columnOf(run, top), bottom: columnOf(run, bottom) }]]
      }),
    ),
    events: run.task.output.events.reduce((total, events) => total + events, 0),
    ...(stoppedEarly.length > 0 ? { stoppedEarly } : {}),
  }
}
