import type { Chain } from '../chain/chain.js'
import type { Model } from '../model/model.js'
import type { MeasureColumns } from './columns.js'
import { sharesOfBins, sharesOfValueTimes } from './histogram-shares.js'
import type { MeasureObservations, Observations, RunSettings, StoppedReplication } from './observations.js'
import { type Replicated, type RunOptions, replicate } from './replications.js'

export interface SimulateOptions extends RunOptions {
  /** Closed class of each state of the chain, -1 for a transient one: fills `endedIn`. Length n. */
  readonly classOf?: Int32Array
}

/**
 * Independent replications of a model, observed in batches. The digits depend on the model and the settings alone, not
 * on the number of workers.
 *
 * @param chain the model's states enumerated: alias tables, tens of millions of events a second; undefined where they
 *   are not, then the moves of each state are worked out as it is met
 * @throws StillmarkError bad-run-settings, too-many-values, not-finite, state-too-large, interrupted, and what the
 *   model's moves throw
 */
export async function simulate(
  model: Model,
  chain: Chain | undefined,
  settings: RunSettings,
  options: SimulateOptions = {},
): Promise<Observations> {
  const run = await replicate(model, chain, settings, { purpose: 'run', distributionsAs: 'shares' }, options)
  const { task } = run
  const { classOf } = options
  const stoppedEarly = stoppedOf(run)
  return {
    settings,
    measures: measuresOf(run),
    ...(chain !== undefined && classOf !== undefined
      ? { endedIn: Int32Array.from(task.output.endState, (state) => classOf[state]) }
      : {}),
    ...(chain === undefined ? { finalStates: Float64Array.from(task.output.endValues) } : {}),
    events: task.output.events.reduce((total, events) => total + events, 0),
    workers: run.workers,
    seconds: run.seconds,
    ...(stoppedEarly.length > 0 ? { stoppedEarly } : {}),
  }
}

function measuresOf(run: Replicated): Readonly<Record<string, MeasureObservations>> {
  return Object.fromEntries(run.columns.measures.map((measure) => [measure.name, observationsOf(run, measure)]))
}

function observationsOf(run: Replicated, measure: MeasureColumns): MeasureObservations {
  if (measure.kind === 'histogram') return histogramOf(run, measure.histogram)
  if (measure.kind === 'mean') return { kind: 'mean', batchMeans: columnOf(run, measure.column) }
  return { kind: 'ratio', top: columnOf(run, measure.top), bottom: columnOf(run, measure.bottom) }
}

/** A column's batch means, R × B. */
export function columnOf({ columns, task }: Pick<Replicated, 'columns' | 'task'>, column: number): Float64Array {
  const width = columns.averages.length + columns.firings.length
  const { means } = task.output
  return Float64Array.from({ length: means.length / width }, (_, row) => means[row * width + column])
}

/** Replications that ran out of events, ascending. */
export function stoppedOf({ task }: Pick<Replicated, 'task'>): readonly StoppedReplication[] {
  const { stoppedAt, completed } = task.output
  return Array.from(stoppedAt).flatMap((time, replication) =>
    Number.isNaN(time) ? [] : [{ replication, time, batches: completed[replication] }],
  )
}

function histogramOf(run: Replicated, histogram: number): MeasureObservations {
  const { task, valueTimes, columns } = run
  if ('rowStart' in task) return sharesOfBins(task, histogram)
  const times = valueTimes.map((byHistogram) => byHistogram[histogram])
  return sharesOfValueTimes(task.settings, columns.histogramNames[histogram], times)
}
