import { type AnyEstimate, fewestCorrelationTimes, type JudgedMeasure, type Prediction } from './compare-measure.js'
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
  const mixture = (structure?.classes.filter((each) => each.reachedWith > 0).length ?? 1) > 1
  return [
    ...slowMixing(predictions, run),
    ...narrowIntervals(of('interval too narrow'), predictions),
    ...biasLeft(of('bias left'), predictions, run),
    ...(run.unsettled === undefined ? [] : [unsettled(run)]),
    ...simulationOff(of('off')),
    ...tooShort([...of('too wide'), ...of('no interval'), ...of('slow')], adjusted, run, mixture),
    ...harmless(of('harmless')),
  ]
}

const list = (names: readonly string[]): string =>
  names.length < 2 ? names.join('') : `${names.slice(0, -1).join(', ')} and ${names[names.length - 1]}`

function slowMixing(predictions: Readonly<Record<string, Prediction>>, run: RunFacts): Finding[] {
  const slow = Object.entries(predictions).filter(([, each]) => each.slow)
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

function tooShort(
  measures: readonly [string, JudgedMeasure][],
  adjusted: Readonly<Record<string, AnyEstimate>>,
  run: RunFacts,
  mixture: boolean,
): Finding[] {
  if (measures.length === 0) return []
  let factor = 2
  const parts = measures.map(([name, { adjustedHalfWidth, tolerance }]) => {
    if (adjustedHalfWidth === undefined) {
      const estimate = adjusted[name]
      return `${name} has no interval: ${'points' in estimate ? 'nothing seen' : (estimate.noInterval ?? 'too few data')}`
    }
    if (tolerance > 0) factor = Math.max(factor, ((2 * adjustedHalfWidth) / tolerance) ** 2)
    return `${name} is known to ± ${shown(adjustedHalfWidth, 2)}, and ${shown(tolerance, 2)} matters`
  })
  const longer = roundedUp(run.runLength * Math.min(factor, 1e9))
  const more = roundedUp(run.replications * Math.min(factor, 1e9))
  return [
    {
      code: 'too-short',
      says: `The run is too short to say whether ${list(measures.map(([name]) => name))} ${measures.length === 1 ? 'agrees' : 'agree'}.`,
      evidence: `${parts.join('; ')}.`,
      next: mixture
        ? `Run more replications: --replications ${more} would decide.`
        : `Run longer: --run-length ${longer} would decide. Or allow a larger difference with --tolerance.`,
    },
  ]
}

function harmless(measures: readonly [string, JudgedMeasure][]): Finding[] {
  return measures.map(([name, { difference, exact, tolerance, pValue }]) => ({
    code: 'harmless-difference' as const,
    says: `The simulation of ${name} is visibly off, but by less than matters.`,
    evidence: `It is off by ${shown(difference)}${exact === 0 ? '' : ` (${percent(Math.abs(difference / exact))})`}, ${shown(tolerance)} is allowed; chance alone does this once in ${shown(1 / Math.max(pValue, 1e-12), 2)} runs.`,
    next: 'Nothing, if that tolerance is yours. Otherwise repeat with another --seed and a smaller --tolerance.',
  }))
}

/** Up to two significant digits, so that it can be pasted. */
export function roundedUp(value: number): number {
  const unit = 10 ** (Math.floor(Math.log10(value)) - 1)
  return unit >= 1 ? Math.ceil(value / unit) * unit : Math.ceil(value * 100) / 100
}
