import { warmUpCut } from '../estimation/marginal-standard-error.js'
import { pleasantAbove } from '../planning/run-length.js'
import { type PilotSeries, simulatePilot } from '../simulation/pilot.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import type { Ground } from './ground.js'
import type { Progress } from './options.js'
import { eventsPerTimeUnit } from './pace.js'
import type { RunRequest } from './run-request.js'

/** Points that a pilot's time is cut into, a multiple of MSER's batches of five. */
const pilotPoints = 1000
/** Firings a replication of the first pilot has; each further one is four times as long. */
const firstPilot = 1000
const pilotEvents = 6e6
/** The same where the moves of each state are worked out as it is met, which takes ten times as long. */
const pilotEventsWithoutStates = 6e5
/** A cut within this part of the pilot's length is early enough to be believed. */
const earlyCut = 0.25
export interface PilotWarmUp {
  readonly pilot: PilotSeries
  readonly warmUp: number
  readonly basis: string
  readonly unsettled?: string
}

/**
 * Pilots of growing length until the rule's cut of every measure lies early in them. Where the start is outside the closed
 * classes, at least twenty mean times of getting into one are deleted: averaged runs hide that some are not there yet.
 */
export async function pilotWarmUp(
  ground: Ground,
  exact: ExactAnswer | undefined,
  request: RunRequest,
  report: { readonly onProgress: (progress: Progress) => void; readonly signal: AbortSignal },
): Promise<PilotWarmUp> {
  const found = await warmUpByCuts(ground, exact, request, report)
  const least = settlingTimes * (ground.finite?.structure.meanTimeToSettle ?? 0)
  if (!(found.warmUp < least) || found.unsettled !== undefined) return found
  const warmUp = pleasantAbove(least)
  return {
    ...found,
    warmUp: ground.model.time === 'discrete' ? Math.ceil(warmUp) : warmUp,
    basis: `${settlingTimes} times the mean time until the model has settled in a closed class`,
  }
}

/** Mean times to settle that are deleted at least; common practice, no source. */
const settlingTimes = 20

async function warmUpByCuts(
  ground: Ground,
  exact: ExactAnswer | undefined,
  { seed, replications, workers }: RunRequest,
  { onProgress, signal }: { readonly onProgress: (progress: Progress) => void; readonly signal: AbortSignal },
): Promise<PilotWarmUp> {
  const { model, finite } = ground
  const discrete = model.time === 'discrete'
  const perTimeUnit = Math.max(eventsPerTimeUnit(ground, exact, undefined), 1e-300)
  // A single long replication has no others to be averaged with: pilots always have a few.
  const pilots = Math.min(Math.max(replications, 8), 32)
  const budget = finite === undefined ? pilotEventsWithoutStates : pilotEvents
  let longest = budget / pilots / perTimeUnit
  let length = Math.min(firstPilot / perTimeUnit, longest)
  for (;;) {
    const steps = discrete ? Math.max(1, Math.ceil(length)) : length
    const points = discrete && steps < pilotPoints ? steps : pilotPoints
    onProgress({ stage: 'pilot' })
    const pilot = await simulatePilot(
      model,
      finite?.chain,
      { seed, replications: pilots, length: steps, points },
      { workers, signal, maxEvents: Math.ceil((4 * budget) / pilots) },
    )
    const cuts = Object.values(pilot.measures).flatMap((measure) =>
      (measure.kind === 'mean' ? [measure.means] : [measure.top, measure.bottom]).map((series) =>
        warmUpCut(series, pilots),
      ),
    )
    const worst = cuts.reduce((a, b) => (a.settled && (!b.settled || b.cut > a.cut) ? b : a), {
      cut: 0,
      settled: true,
      why: 'nothing has to be deleted',
    })
    if (worst.settled && worst.cut <= earlyCut * points) {
      const warmUp = worst.cut === 0 ? 0 : pleasantAbove((worst.cut * steps) / points)
      return {
        pilot,
        warmUp: discrete ? Math.ceil(warmUp) : warmUp,
        basis: `${worst.why} of ${pilots} averaged pilots`,
      }
    }
    if (length >= longest || pilot.stoppedEarly !== undefined) {
      return {
        pilot,
        warmUp: steps,
        basis: 'the whole pilot is deleted',
        unsettled: worst.settled ? 'the best cut lies late in the longest pilot' : worst.why,
      }
    }
    if (finite === undefined) longest = budget / Math.max(pilot.events / steps, 1e-300)
    length = Math.min(4 * length, longest)
    if (length <= steps) {
      return { pilot, warmUp: steps, basis: 'the whole pilot is deleted', unsettled: worst.why }
    }
  }
}
