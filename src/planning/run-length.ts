import { usualDegreesOfFreedom } from '../estimation/joined-batches.js'
import { studentTailQuantile } from '../numbers/distributions.js'

/** What one measure asks of the run. */
export interface MeasureNeed {
  readonly name: string
  /** Limit of T · Var(time average over T). */
  readonly varianceConstant: number
  /** The difference that matters, in the measure's unit. */
  readonly tolerance: number
  readonly correlationTime: number
}

export interface RunLength {
  /** Time units that each replication observes. */
  readonly runLength: number
  /** What decided it, in words. */
  readonly basis: string
}

/** The interval should be so many times narrower than the tolerance: then a right simulation agrees, luck or no luck. */
const marginOfTolerance = 2
/** Correlation times that a replication lasts at least. */
const fewestCorrelationTimes = 50
/** Room for the spread of the half-width itself: at 15 degrees of freedom four in five are within it. */
const room = 1.15

/**
 * The run length at which every measure's adjusted half-width should be half its tolerance, within a budget of events.
 * Half-width t·√(variance constant / (R·T)): Whitt 1989 (from memory).
 */
export function chooseRunLength(
  needs: readonly MeasureNeed[],
  given: {
    readonly replications: number
    /** Adjusted for the number of measures. */
    readonly confidence: number
    readonly eventsPerTimeUnit: number
    /** In all replications. */
    readonly maxEvents: number
    readonly warmUp: number
  },
): RunLength {
  const { replications, confidence, eventsPerTimeUnit, maxEvents, warmUp } = given
  const quantile = studentTailQuantile((1 - confidence) / 2, usualDegreesOfFreedom(replications)) * room
  let wanted = 50 * warmUp
  let basis = 'fifty times the warm-up'
  for (const { name, varianceConstant, tolerance, correlationTime } of needs) {
    if (tolerance > 0) {
      const time = (varianceConstant / replications) * ((marginOfTolerance * quantile) / tolerance) ** 2
      if (time > wanted) {
        wanted = time
        basis = `the interval of ${name} should be half as wide as its tolerance`
      }
    }
    if (fewestCorrelationTimes * correlationTime > wanted) {
      wanted = fewestCorrelationTimes * correlationTime
      basis = `each replication should last ${fewestCorrelationTimes} correlation times of ${name}`
    }
  }
  // Something must happen: a thousand firings a replication, whatever the measures.
  const busy = 1000 / Math.max(eventsPerTimeUnit, 1e-300)
  if (!(wanted > busy)) {
    wanted = busy
    basis = 'a thousand firings a replication'
  }
  const most = maxEvents / replications / Math.max(eventsPerTimeUnit, 1e-300) - warmUp
  if (wanted > most)
    return {
      runLength: pleasantBelow(Math.max(most, busy)),
      basis: `at most ${maxEvents.toLocaleString('en-US')} events in all`,
    }
  return { runLength: pleasantAbove(wanted), basis }
}

const steps = [1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8, 10]

/** The next number up of 1, 1.2, 1.5, 2, 2.5, 3, 4, 5, 6, 8 times a power of ten. */
export function pleasantAbove(value: number): number {
  const unit = 10 ** Math.floor(Math.log10(value))
  return tidy((steps.find((step) => step * unit >= value * (1 - 1e-12)) ?? 10) * unit)
}

export function pleasantBelow(value: number): number {
  const unit = 10 ** Math.floor(Math.log10(value))
  return tidy((steps.findLast((step) => step * unit <= value * (1 + 1e-12)) ?? 1) * unit)
}

const tidy = (value: number): number => Number(value.toPrecision(6))
