import { neverSeen } from '../estimation/batch-means.js'
import { type AnyEstimate, fewestCorrelationTimes, type Prediction } from './compare-measure.js'
import type { JudgedMeasure } from './judged-measure.js'
import { inUnits, percent, shown } from './shown-number.js'
import type { StructureFacts } from './structure-findings.js'
import type { Finding } from './verdict.js'

/** What findings need to know of the run. */
export interface RunFacts {
  readonly unit: string
  readonly replications: number
  readonly runLength: number
  readonly warmUp: number
  /** Why the warm-up rule is not to be believed; undefined where it is, or where the length was given. */
  readonly unsettled?: string
}

export function measureFindings(
  judged: Readonly<Record<string, JudgedMeasure>>,
  adjusted: Readonly<Record<string, AnyEstimate>>,
  predictions: Readonly<Record<string, Prediction>>,
  run: RunFacts,
  structure: StructureFacts | undefined,
): Finding[] {
  const of = (reason: JudgedMeasure['reason']) => Object.entries(judged).filter(([, each]) => each.reason === reason)
  const never = ([name, { exact }]: [string, JudgedMeasure]): boolean => {
    const estimate = adjusted[name]
    return exact !== 0 && 'noInterval' in estimate && estimate.noInterval === neverSeen
  }
  const mixture = (structure?.classes.filter((each) => each.reachedWith > 0).length ?? 1) > 1
  return [
    ...slowMixing(predictions, run),
    ...narrowIntervals(of('interval too narrow'), predictions),
    ...biasLeft(of('bias left'), predictions, run),
    ...(run.unsettled === undefined ? [] : [unsettled(run)]),
    ...simulationOff(of('off')),
    ...rare(of('no interval').filter(never), predictions, run),
    ...tooShort(
      [...of('too wide'), ...of('no interval').filter((each) => !never(each)), ...of('slow')],
      adjusted,
      predictions,
      run,
      mixture,
    ),
    ...noPercentage(of('no percentage')),
    ...harmless(of('harmless')),
  ]
}

const list = (names: readonly string[]): string =>
  names.length < 2 ? names.join('') : `${names.slice(0, -1).join(', ')} and ${names[names.length - 1]}`

function slowMixing(predictions: Readonly<Record<string, Prediction>>, run: RunFacts): Finding[] {
  const slow = Object.entries(predictions).filter(
    ([, each]) => each.slow && each.correlationTime * fewestCorrelationTimes > run.runLength,
  )
  if (slow.length === 0) return []
  const longest = Math.max(...slow.map(([, { correlationTime }]) => correlationTime))
  return [
    {
      code: 'slow-mixing',
      says: `The model forgets so slowly that a replication of ${inUnits(run.runLength, run.unit)} holds few independent looks at ${list(slow.map(([name]) => name).slice(0, 4))}.`,
      evidence: `What is seen at two moments hangs together over ${inUnits(longest, run.unit)} (integrated correlation time, exact); a replication lasts ${shown(run.runLength / longest)} of these.`,
      next: `Let each replication observe at least ${fewestCorrelationTimes} of them: --run-length ${roundedUp(fewestCorrelationTimes * longest)}.`,
    },
  ]
}

function narrowIntervals(
  measures: readonly [string, JudgedMeasure][],
  predictions: Readonly<Record<string, Prediction>>,
): Finding[] {
  return measures.map(([name, { adjustedHalfWidth }]) => ({
    code: 'batches-short' as const,
    says: `The interval of ${name} is too narrow to be believed.`,
    evidence: `Its half-width is ${percent((adjustedHalfWidth ?? 0) / predictions[name].halfWidth)} of the one that the exact variance gives for this run: the run has not shown how far ${name} swings.`,
    next: 'Run longer, so that each replication sees the slow swings several times.',
  }))
}

function biasLeft(
  measures: readonly [string, JudgedMeasure][],
  predictions: Readonly<Record<string, Prediction>>,
  run: RunFacts,
): Finding[] {
  return measures.map(([name, { difference }]) => ({
    code: 'bias-left' as const,
    says: `The start is still seen in ${name}: the warm-up of ${inUnits(run.warmUp, run.unit)} is too short.`,
    evidence: `A bias of ${shown(predictions[name].bias ?? 0)} is left after it (exact), and the simulation is off by ${shown(difference)}.`,
    next: `Delete more: --warm-up ${roundedUp(Math.max(2 * run.warmUp, predictions[name].correlationTime * 5))}.`,
  }))
}

const unsettled = (run: RunFacts): Finding => ({
  code: 'bias-left',
  says: 'The warm-up rule found no point from which on the pilot runs have settled.',
  evidence: `${(run.unsettled ?? '').charAt(0).toUpperCase()}${(run.unsettled ?? '').slice(1)}. The longest pilot tried is deleted: ${inUnits(run.warmUp, run.unit)}.`,
  next: 'Give a warm-up that you can defend with --warm-up, or look whether the model settles at all.',
})

function simulationOff(measures: readonly [string, JudgedMeasure][]): Finding[] {
  if (measures.length === 0) return []
  const parts = measures.map(
    ([name, { estimate, exact, adjustedHalfWidth }]) =>
      `${name}: simulated ${shown(estimate, 6)} ± ${shown(adjustedHalfWidth ?? 0, 2)}, exact ${shown(exact, 6)}`,
  )
  return [
    {
      code: 'simulation-off',
      says: `The simulation gives another long-run value than the model has: ${list(measures.map(([name]) => name))}.`,
      evidence: `${parts.join('; ')} (intervals widened for the number of measures).`,
      next: 'One of the two is wrong. Repeat with another --seed; if it stays, report it with the scenario file.',
    },
  ]
}

/** How many times as long a run must be for a half-width of half the tolerance: it falls with the root of the length. */
const timesAsLong = (halfWidth: number, tolerance: number): number => ((2 * halfWidth) / tolerance) ** 2

/** Beyond so many times the length nobody runs. */
const mostTimesAsLong = 1e4

function rare(
  measures: readonly [string, JudgedMeasure][],
  predictions: Readonly<Record<string, Prediction>>,
  run: RunFacts,
): Finding[] {
  return measures.map(([name, { exact, tolerance }]) => {
    const times = name in predictions ? timesAsLong(predictions[name].halfWidth, tolerance) : Number.POSITIVE_INFINITY
    return {
      code: 'rare-states' as const,
      says: `What ${name} measures is so rare that the run never met it.`,
      evidence: `Its exact value is ${shown(exact)}; the run observed ${inUnits(run.replications * run.runLength, run.unit)} in all.`,
      next:
        times <= mostTimesAsLong
          ? `Take the exact value, or run longer: --run-length ${roundedUp(run.runLength * times)} should decide.`
          : 'Take the exact value: no run of a length that can be afforded shows it.',
    }
  })
}

function tooShort(
  measures: readonly [string, JudgedMeasure][],
  adjusted: Readonly<Record<string, AnyEstimate>>,
  predictions: Readonly<Record<string, Prediction>>,
  run: RunFacts,
  mixture: boolean,
): Finding[] {
  if (measures.length === 0) return []
  let times = 2
  const parts = measures.map(([name, { adjustedHalfWidth, tolerance }]) => {
    const estimate = adjusted[name]
    const predicted = predictions[name]?.halfWidth ?? 0
    // The interval of a quantile jumps from value to value: no law says when it will hold one only.
    if ('low' in estimate && adjustedHalfWidth !== undefined) {
      times = Math.max(times, 4)
      return `${name} lies between ${shown(estimate.low ?? Number.NaN)} and ${shown(estimate.high ?? Number.NaN)}`
    }
    times = Math.max(times, timesAsLong(Math.max(adjustedHalfWidth ?? 0, predicted), tolerance))
    if (adjustedHalfWidth === undefined) {
      const why = 'points' in estimate ? 'too few batches, or they hang together' : estimate.noInterval
      return `${name} has no interval: ${why ?? 'too few data'}`
    }
    return `${name} is known to ± ${shown(adjustedHalfWidth, 2)}, and ${shown(tolerance, 2)} matters`
  })
  const option = mixture
    ? `Run more replications: --replications ${roundedUp(run.replications * times)} should decide.`
    : `Run longer: --run-length ${roundedUp(run.runLength * times)} should decide. Or allow a larger difference with --tolerance.`
  return [
    {
      code: 'too-short',
      says: `The run is too short to say whether ${list(measures.map(([name]) => name))} ${measures.length === 1 ? 'agrees' : 'agree'}.`,
      evidence: `${parts.join('; ')}.`,
      next:
        times <= mostTimesAsLong
          ? option
          : 'Allow a larger difference with --tolerance: no affordable run decides this.',
    },
  ]
}

const noPercentage = (measures: readonly [string, JudgedMeasure][]): Finding[] =>
  measures.length === 0
    ? []
    : [
        {
          code: 'too-short',
          says: `The exact value of ${list(measures.map(([name]) => name))} is 0, and a tolerance in percent allows nothing there.`,
          evidence: `${measures.map(([name, { estimate, adjustedHalfWidth }]) => `${name}: simulated ${shown(estimate)} ± ${shown(adjustedHalfWidth ?? 0, 2)}`).join('; ')}, and 0 lies inside.`,
          next: 'Give the difference that matters as a plain number, --tolerance 0.01 say.',
        },
      ]

function harmless(measures: readonly [string, JudgedMeasure][]): Finding[] {
  return measures.map(([name, { difference, exact, tolerance, pValue }]) => ({
    code: 'harmless-difference' as const,
    says: `The simulation of ${name} is visibly off, but by less than matters.`,
    evidence: `It is off by ${shown(difference)}${exact === 0 ? '' : ` (${percent(Math.abs(difference / exact))})`}, ${shown(tolerance)} is allowed; chance alone does this ${pValue < 1e-9 ? 'in no run' : `once in ${shown(Number((1 / pValue).toPrecision(2)))} runs`}.`,
    next: 'Nothing, if that tolerance is yours. Otherwise repeat with another --seed and a smaller --tolerance.',
  }))
}

/** Up to two significant digits, so that it can be pasted. */
export function roundedUp(value: number): number {
  const unit = 10 ** (Math.floor(Math.log10(value)) - 1)
  // Rounding of the quotient must not take a number that is round already to the next one.
  const rounded = Math.ceil((value / unit) * (1 - 1e-12)) * unit
  return Number(rounded.toPrecision(2))
}
