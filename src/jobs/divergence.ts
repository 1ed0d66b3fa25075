import { halfWidthOf, meanOf } from '../estimation/batch-means.js'
import type { Prediction } from '../recurrence/classification.js'
import { simulate } from '../simulation/simulate.js'
import type { DivergencePart, PredictionPart } from './document.js'
import type { Ground } from './ground.js'
import type { RunRequest } from './run-request.js'

/**
 * Replications of the run that predictions are held against. A law of growth is about the mean over many runs, and the
 * spread of one run is as large as its mean; a speed is shown by every long run alone.
 */
const replicationsFor = { growth: 4000, speed: 200 }
/** Firings in all. */
const events = 8e6
/** A limit law is approached slowly: differences below this are not held against it. */
const leastTolerance = 0.05

/** Holds the predicted growth of a model without steady state against runs from its start. */
export async function divergencePart(
  { model, countable, part }: Ground,
  request: RunRequest,
  eventsPerTimeUnit: number,
  signal: AbortSignal,
): Promise<DivergencePart | undefined> {
  if (countable === undefined || model.kind !== 'variables') return undefined
  if (part.recurrence === 'positive recurrent' || part.recurrence === 'undetermined') return undefined
  const measurable = (countable.growth ?? []).filter(({ name }) => /^(speed|growth)_/.test(name))
  const predictions: Record<string, PredictionPart> = {}
  if (measurable.length > 0 && countable.explosive !== true) {
    const replications = measurable.some(({ name }) => name.startsWith('growth_'))
      ? replicationsFor.growth
      : replicationsFor.speed
    const length = Math.max(1, events / replications / Math.max(eventsPerTimeUnit, 1e-300))
    // Even, so that half of it is whole steps too.
    const runLength = model.time === 'discrete' ? 2 * Math.ceil(length / 2) : length
    const runTo = async (time: number) => {
      const { finalStates, stoppedEarly } = await simulate(
        model,
        undefined,
        { seed: `${request.seed} growth`, replications, warmUp: 0, runLength: time, batches: 1 },
        { workers: request.workers, signal, maxEvents: 1e6 },
      )
      return stoppedEarly === undefined ? finalStates : undefined
    }
    // The same draws, so the same paths, once half way and once to the end.
    const half = await runTo(runLength / 2)
    const end = await runTo(runLength)
    for (const prediction of measurable) {
      predictions[prediction.name] =
        half === undefined || end === undefined
          ? unobserved(prediction)
          : observedAgainst(prediction, model.elements, model.start, half, end, runLength, request)
    }
  }
  for (const prediction of countable.growth ?? []) predictions[prediction.name] ??= unobserved(prediction)
  return {
    predictions,
    remedies: countable.remedies.map(({ constant, now, threshold, steadyWhen }) => ({
      constant,
      now,
      threshold,
      steadyWhen,
    })),
  }
}

const unobserved = ({ value, inMean }: Prediction): PredictionPart => ({
  predicted: value,
  observed: null,
  halfWidth: null,
  verdict: 'undecided',
  ...(inMean === undefined ? {} : { inMean }),
})

/**
 * A speed is taken over the second half of the runs, a law of growth at their end. Where the first half shows something
 * else, the limit is not reached yet, and a difference from it is no contradiction.
 */
function observedAgainst(
  prediction: Prediction,
  elements: readonly string[],
  start: Float64Array,
  half: Float64Array,
  end: Float64Array,
  time: number,
  { confidence, tolerance }: RunRequest,
): PredictionPart {
  const [, kind, name] = /^(speed|growth)_(.*)$/.exec(prediction.name) ?? []
  const at = elements.indexOf(name)
  if (at < 0) return unobserved(prediction)
  const width = elements.length
  const replications = end.length / width
  const early = new Float64Array(replications)
  const late = new Float64Array(replications)
  for (let r = 0; r < replications; r++) {
    const first = half[r * width + at] - start[at]
    const all = end[r * width + at] - start[at]
    early[r] = kind === 'speed' ? first / (time / 2) : first / Math.sqrt(time / 2)
    late[r] = kind === 'speed' ? (all - first) / (time / 2) : all / Math.sqrt(time)
  }
  const { estimate, standardError } = meanOf(late)
  const halfWidth = halfWidthOf(standardError, replications - 1, confidence)
  const relative = Math.max(tolerance.kind === 'relative' ? tolerance.value : 0, leastTolerance)
  const allowed = relative * Math.abs(prediction.value)
  const difference = Math.abs(estimate - prediction.value)
  const change = meanOf(late.map((each, r) => each - early[r]))
  const moving = Math.abs(change.estimate) > halfWidthOf(change.standardError, replications - 1, confidence)
  const off = difference > halfWidth && difference > allowed && !moving
  return {
    predicted: prediction.value,
    observed: estimate,
    halfWidth,
    verdict: difference + halfWidth <= allowed ? 'agrees' : off ? 'disagrees' : 'undecided',
    ...(prediction.inMean === undefined ? {} : { inMean: prediction.inMean }),
  }
}
