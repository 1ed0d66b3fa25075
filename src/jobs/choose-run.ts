import { toleranceOf } from '../comparison/compare-measure.js'
import { adjustedConfidence } from '../comparison/compare-run.js'
import type { TimeAverage } from '../dynamics/time-average.js'
import { chooseRunLength, type MeasureNeed, pleasantAbove } from '../planning/run-length.js'
import type { RunSettings } from '../simulation/observations.js'
import type { PilotSeries } from '../simulation/pilot.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import type { Ground } from './ground.js'
import { exactWarmUp } from './known-dynamics.js'
import type { Progress } from './options.js'
import { eventsPerTimeUnit } from './pace.js'
import { pilotWarmUp } from './pilot-warm-up.js'
import { runDefaults } from './run-defaults.js'
import type { RunRequest } from './run-request.js'

/** What is run, and why so. */
export interface ChosenRun {
  readonly settings: RunSettings
  readonly warmUpRule: string
  readonly warmUpBasis: string
  readonly runLengthBasis: string
  /** Why the rule's cut is not to be believed. */
  readonly unsettled?: string
}

/** Events in all, where the moves of each state are worked out as it is met. */
const eventsWithoutStates = 2e7

export async function chooseRun(
  ground: Ground,
  exact: ExactAnswer | undefined,
  averages: Readonly<Record<string, TimeAverage>>,
  request: RunRequest,
  report: { readonly onProgress: (progress: Progress) => void; readonly signal: AbortSignal },
): Promise<ChosenRun> {
  const { model, finite } = ground
  const { seed, replications, confidence } = request
  const discrete = model.time === 'discrete'
  const whole = (time: number): number => (discrete ? Math.max(1, Math.ceil(time)) : time)
  let pilot: PilotSeries | undefined
  let warmUp = request.warmUp === undefined ? 0 : discrete ? Math.ceil(request.warmUp) : request.warmUp
  let warmUpRule = 'given'
  let warmUpBasis = 'as given'
  let unsettled: string | undefined
  const byBias = warmUpByBias(ground, exact, averages, request)
  if (byBias !== undefined) {
    return {
      settings: {
        seed,
        replications,
        warmUp: byBias.warmUp,
        runLength: whole(byBias.runLength),
        batches: batchesOf(ground, byBias.runLength, discrete),
      },
      warmUpRule: 'exact bias below a fortieth of the half-width',
      warmUpBasis: byBias.basis,
      runLengthBasis: byBias.runLengthBasis,
    }
  }
  if (request.warmUp === undefined || request.runLength === undefined) {
    const found = await pilotWarmUp(ground, exact, request, report)
    pilot = found.pilot
    if (request.warmUp === undefined) {
      warmUp = found.warmUp
      warmUpRule = 'MSER-5 on pilot replications'
      warmUpBasis = found.basis
      unsettled = found.unsettled
    }
  }
  let runLength = request.runLength
  let runLengthBasis = 'as given'
  if (runLength === undefined) {
    const perTimeUnit = eventsPerTimeUnit(ground, exact, pilot)
    const chosen = chooseRunLength(
      Object.keys(averages).length === 0 && pilot !== undefined
        ? pilotNeeds(pilot, warmUp, request)
        : needsOf(ground, exact, averages, request),
      {
        replications,
        confidence: adjustedConfidence(confidence, model.measures.length),
        eventsPerTimeUnit: perTimeUnit,
        maxEvents: finite === undefined ? eventsWithoutStates : runDefaults.events,
        warmUp,
      },
    )
    runLength = chosen.runLength
    runLengthBasis = chosen.basis
  }
  return {
    settings: {
      seed,
      replications,
      warmUp,
      runLength: whole(runLength),
      batches: batchesOf(ground, runLength, discrete),
    },
    warmUpRule,
    warmUpBasis,
    runLengthBasis,
    ...(unsettled === undefined ? {} : { unsettled }),
  }
}

/**
 * Warm-up and run length from the exact dynamics, where they are known: the two depend on one another, so the length is
 * chosen once without and once with the warm-up. Undefined where the warm-up is given or asked of another rule.
 */
function warmUpByBias(
  ground: Ground,
  exact: ExactAnswer | undefined,
  averages: Readonly<Record<string, TimeAverage>>,
  request: RunRequest,
):
  | { readonly warmUp: number; readonly runLength: number; readonly basis: string; readonly runLengthBasis: string }
  | undefined {
  const { model } = ground
  if (request.warmUp !== undefined || request.warmUpRule === 'mser' || exact === undefined) return undefined
  const perTimeUnit = eventsPerTimeUnit(ground, exact, undefined)
  const lengthFor = (warmUp: number) =>
    request.runLength === undefined
      ? chooseRunLength(needsOf(ground, exact, averages, request), {
          replications: request.replications,
          confidence: adjustedConfidence(request.confidence, model.measures.length),
          eventsPerTimeUnit: perTimeUnit,
          maxEvents: runDefaults.events,
          warmUp,
        })
      : { runLength: request.runLength, basis: 'as given' }
  const run = { replications: request.replications, confidence: request.confidence }
  const first = model.time === 'discrete' ? 1 : pleasantAbove(1 / Math.max(perTimeUnit, 1e-300))
  const found = exactWarmUp(ground, averages, { ...run, runLength: lengthFor(0).runLength, first })
  if (found === undefined) return undefined
  const { runLength, basis: runLengthBasis } = lengthFor(found.warmUp)
  const basis =
    found.biasPart > 0
      ? `bias left is 1/${Math.floor(Math.min(1 / found.biasPart, 1e6)).toLocaleString('en-US')} of the half-width`
      : 'no bias is left'
  const warmUp = model.time === 'discrete' ? Math.ceil(found.warmUp) : found.warmUp
  return { warmUp, runLength, basis, runLengthBasis }
}

/**
 * Where several closed classes can be reached, a replication as a whole is one observation of where it ends: its batches
 * say nothing of that. In discrete time there is no more than one batch a step.
 */
function batchesOf({ finite }: Ground, runLength: number, discrete: boolean): number {
  const reached = finite?.structure.closedClasses.filter((each) => each.reachedWith > 0).length ?? 1
  if (reached > 1) return 1
  let batches: number = runDefaults.batches
  while (discrete && batches > Math.max(1, runLength)) batches /= 2
  return batches
}

function needsOf(
  { model }: Ground,
  exact: ExactAnswer | undefined,
  averages: Readonly<Record<string, TimeAverage>>,
  { tolerance }: RunRequest,
): MeasureNeed[] {
  if (exact === undefined) return []
  return model.measures.flatMap(({ name }) => {
    const value = exact.measures[name]
    const known = averages[name]
    if (known === undefined || !('value' in value)) return []
    const { varianceConstant, correlationTime } = known
    return [{ name, varianceConstant, correlationTime, tolerance: toleranceOf(value.value, tolerance) }]
  })
}

/**
 * Needs as a pilot shows them: the variance constant from the spread of its replications' means after the warm-up. Rough,
 * but it only sets the length of the run; the run's own intervals do not rest on it.
 */
function pilotNeeds(
  { settings, interval, measures }: PilotSeries,
  warmUp: number,
  { tolerance }: RunRequest,
): MeasureNeed[] {
  const { replications, points } = settings
  const from = Math.min(Math.floor(points / 2), Math.ceil(warmUp / interval))
  const length = (points - from) * interval
  const meansOf = (series: Float64Array): number[] =>
    Array.from({ length: replications }, (_, r) => {
      let sum = 0
      for (let i = from; i < points; i++) sum += series[r * points + i]
      return sum / (points - from)
    })
  return Object.entries(measures).flatMap(([name, measure]) => {
    const top = meansOf(measure.kind === 'mean' ? measure.means : measure.top)
    const bottom = measure.kind === 'mean' ? undefined : meansOf(measure.bottom)
    const mean = average(top)
    const below = bottom === undefined ? 1 : average(bottom)
    if (!Number.isFinite(mean / below)) return []
    const value = mean / below
    const deviations = top.map((each, r) => (each - value * (bottom?.[r] ?? 1)) / below)
    const variance = deviations.reduce((sum, each) => sum + each ** 2, 0) / (replications - 1)
    return [{ name, varianceConstant: variance * length, tolerance: toleranceOf(value, tolerance), correlationTime: 0 }]
  })
}

const average = (values: readonly number[]): number => values.reduce((a, b) => a + b, 0) / values.length
