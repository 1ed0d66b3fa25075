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
    const runLength = model.time === 'discrete' ? Math.ceil(length) : length
    const { finalStates, stoppedEarly } = await simulate(
      model,
      undefined,
      { seed: `${request.seed} growth`, replications, warmUp: 0, runLength, batches: 1 },
      { workers: request.workers, signal, maxEvents: 1e6 },
    )
    for (const prediction of measurable) {
      predictions[prediction.name] =
        finalStates === undefined || stoppedEarly !== undefined
          ? unobserved(prediction)
          : observedAgainst(prediction, model.elements, model.start, finalStates, runLength, request)
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

function observedAgainst(
  prediction: Prediction,
  elements: readonly string[],
  start: Float64Array,
  finalStates: Float64Array,
  time: number,
  { confidence, tolerance }: RunRequest,
): PredictionPart {
  const [, kind, name] = /^(speed|growth)_(.*)$/.exec(prediction.name) ?? []
  const at = elements.indexOf(name)
  if (at < 0) return unobserved(prediction)
  const width = elements.length
  const replications = finalStates.length / width
  const scale = kind === 'speed' ? time : Math.sqrt(time)
  const values = Float64Array.from({ length: replications }, (_, r) => {
    const gained = finalStates[r * width + at] - start[at]
    return gained / scale
  })
  const { estimate, standardError } = meanOf(values)
  const halfWidth = halfWidthOf(standardError, replications - 1, confidence)
  const allowed =
    Math.max(tolerance.kind === 'relative' ? tolerance.value : 0, leastTolerance) * Math.abs(prediction.value)
  const difference = Math.abs(estimate - prediction.value)
  const verdict =
    difference + halfWidth <= allowed
      ? 'agrees'
      : difference > halfWidth && difference > allowed
        ? 'disagrees'
        : 'undecided'
  return {
    predicted: prediction.value,
    observed: estimate,
    halfWidth,
    verdict,
    ...(prediction.inMean === undefined ? {} : { inMean: prediction.inMean }),
  }
}
