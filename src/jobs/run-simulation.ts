import type { AnyEstimate } from '../comparison/compare-measure.js'
import type { Observations } from '../simulation/observations.js'
import { simulate as replicate } from '../simulation/simulate.js'
import type { ChosenRun } from './choose-run.js'
import type { SimulationPart } from './document.js'
import { estimatesOf, simulatedMeasure } from './estimates.js'
import type { Ground } from './ground.js'
import type { Progress } from './options.js'
import type { RunRequest } from './run-request.js'

export interface Simulated {
  readonly observations: Observations
  readonly estimates: Readonly<Record<string, AnyEstimate>>
  readonly part: SimulationPart
}

/** Runs the chosen replications and makes estimates of what they show. */
export async function runSimulation(
  { model, finite, part }: Ground,
  chosen: ChosenRun,
  request: RunRequest,
  { onProgress, signal }: { readonly onProgress: (progress: Progress) => void; readonly signal: AbortSignal },
): Promise<Simulated> {
  const { settings } = chosen
  onProgress({ stage: 'simulating', done: 0, unit: 'events' })
  const observations = await replicate(model, finite?.chain, settings, {
    workers: request.workers,
    signal,
    classOf: finite?.structure.classOf,
    onProgress: ({ events, fraction }) =>
      onProgress({
        stage: 'simulating',
        done: events,
        of: fraction > 0 ? Math.round(events / fraction) : undefined,
        unit: 'events',
      }),
  })
  const all = estimatesOf(model, observations, request.confidence)
  // Without a known steady state there is no long-run mean that an interval could be about.
  const estimates =
    part.recurrence === 'positive recurrent'
      ? all
      : withoutIntervals(
          all,
          part.recurrence === 'undetermined'
            ? 'the model is not known to have a long-run value'
            : 'the model has no long-run value',
        )
  return {
    observations,
    estimates,
    part: {
      seed: settings.seed,
      replications: settings.replications,
      workers: observations.workers,
      warmUp: settings.warmUp,
      warmUpRule: chosen.warmUpRule,
      runLength: settings.runLength,
      events: observations.events,
      seconds: observations.seconds,
      measures: Object.fromEntries(Object.entries(estimates).map(([name, each]) => [name, simulatedMeasure(each)])),
    },
  }
}

function withoutIntervals(
  estimates: Readonly<Record<string, AnyEstimate>>,
  noLongRun: string,
): Record<string, AnyEstimate> {
  const bare = ({ estimate, confidence, method }: Extract<AnyEstimate, { estimate: number }>) => ({
    estimate,
    confidence,
    method,
    noInterval: noLongRun,
  })
  return Object.fromEntries(
    Object.entries(estimates).map(([name, each]) => [
      name,
      'points' in each ? { ...each, points: each.points.map(bare) } : bare(each),
    ]),
  )
}
