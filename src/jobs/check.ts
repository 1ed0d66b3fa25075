import { shownState } from '../chain/shown-state.js'
import { adjustedConfidence, compareRun } from '../comparison/compare-run.js'
import { divergenceFindings } from '../comparison/divergence-findings.js'
import type { StructureFacts } from '../comparison/structure-findings.js'
import type { Comparison, Finding } from '../comparison/verdict.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import { chooseRun } from './choose-run.js'
import { withDeadline } from './deadline.js'
import { divergencePart } from './divergence.js'
import type { DivergencePart, StillmarkDocument, StructurePart } from './document.js'
import { adjustedEstimates } from './estimates.js'
import { exactAnswer } from './exact-answer.js'
import { exactPart } from './exact-part.js'
import { type Ground, layGround } from './ground.js'
import type { JobResult } from './job-result.js'
import { knownTimeAverages, predictionsOf } from './known-dynamics.js'
import type { JobOptions } from './options.js'
import { runRequest } from './run-request.js'
import { runSimulation } from './run-simulation.js'
import { claimsToJudge, detailsOf, scenarioPart } from './scenario-part.js'
import { openClass } from './sentences.js'

/** The main job: structure, exact answer, simulation, comparison, claims. */
export async function check(file: string, options: JobOptions = {}): Promise<JobResult> {
  const report = withDeadline(options)
  const ground = await layGround(file, options, report.onProgress)
  const { exact, absent } = exactAnswer(ground, options, report)
  const request = runRequest(ground.scenario, options)
  const averages = knownTimeAverages(ground, exact)
  const chosen = await chooseRun(ground, exact, averages, request, report)
  const simulated = await runSimulation(ground, chosen, request, report)
  report.onProgress({ stage: 'comparing' })
  const { settings } = chosen
  const confidence = adjustedConfidence(request.confidence, ground.model.measures.length)
  const compared = compareRun({
    exact,
    adjusted: adjustedEstimates(ground.model, simulated.observations, simulated.estimates, confidence),
    tolerance: request.tolerance,
    claims: claimsToJudge(ground.scenario),
    predictions: predictionsOf(ground, averages, { ...settings, confidence }),
    structure: structureFacts(ground, exact),
    run: {
      unit: ground.model.unit,
      replications: settings.replications,
      runLength: settings.runLength,
      warmUp: settings.warmUp,
      unsettled: exact === undefined ? undefined : chosen.unsettled,
    },
    causes: causesOf(ground),
  })
  const perTimeUnit = simulated.observations.events / (settings.replications * (settings.warmUp + settings.runLength))
  const divergence = await divergencePart(ground, request, perTimeUnit, report.signal)
  const comparison = withoutSteadyState(compared, ground, divergence)
  const document: StillmarkDocument = {
    format: 'stillmark/check/1',
    scenario: scenarioPart(ground.scenario),
    structure: ground.part,
    ...exactPart(exact, absent),
    ...(divergence === undefined ? {} : { divergence }),
    simulation: simulated.part,
    comparison,
  }
  return {
    document,
    exitStatus: exitStatusOf(ground, comparison),
    details: {
      ...detailsOf(ground.scenario, nextOf(comparison, exact, settings.runLength), request),
      warmUpBasis: chosen.warmUpBasis,
      runLengthBasis: chosen.runLengthBasis,
      ...(ground.scenario.expect === undefined || ground.part.recurrence === 'undetermined'
        ? {}
        : { expectationMet: isExpected(ground.scenario.expect, ground.part) }),
    },
  }
}

export function structureFacts({ finite }: Ground, exact: ExactAnswer | undefined): StructureFacts | undefined {
  if (finite === undefined) return undefined
  const { chain, structure } = finite
  return {
    classes: structure.closedClasses.map(({ states, period, reachedWith }, i) => ({
      size: states.length,
      period,
      reachedWith,
      example: shownState(chain, states[0]),
      measures: Object.fromEntries(
        Object.entries(exact?.byClass?.[i] ?? {}).flatMap(([name, each]) =>
          'value' in each ? [[name, each.value]] : [],
        ),
      ),
    })),
    transientStates: structure.transientStates.length,
    meanTimeToSettle: structure.meanTimeToSettle,
  }
}

/** What is the matter with a model that has no steady state, or whose class is open. */
export function causesOf({ part, countable }: Ground): Finding[] {
  if (countable === undefined) return []
  return part.recurrence === 'undetermined' ? [openClass(part)] : divergenceFindings(countable)
}

/** There is nothing to agree with: but a simulation that contradicts the predicted growth is off all the same. */
function withoutSteadyState(
  compared: Comparison,
  { part }: Ground,
  divergence: DivergencePart | undefined,
): Comparison {
  if (part.recurrence !== 'null recurrent' && part.recurrence !== 'transient') return compared
  const off = Object.values(divergence?.predictions ?? {}).some(({ verdict }) => verdict === 'disagrees')
  return { ...compared, verdict: off ? 'disagrees' : 'no steady state' }
}

/** An expectation that the structure contradicts is a disagreement, whatever the numbers say. */
function exitStatusOf({ scenario, part }: Ground, { verdict }: Comparison): 0 | 1 | 3 {
  const { expect } = scenario
  if (expect !== undefined && part.recurrence !== 'undetermined' && !isExpected(expect, part)) return 1
  if (verdict === 'no steady state') return expect === undefined ? 1 : 0
  return verdict === 'agrees' ? 0 : verdict === 'undecided' ? 3 : 1
}

export const isExpected = (expect: string, { recurrence, explosive }: StructurePart): boolean =>
  expect === 'explosive' ? explosive === true : expect === recurrence

function nextOf(
  { findings, verdict, measures }: Comparison,
  exact: ExactAnswer | undefined,
  runLength: number,
): string {
  if (verdict === 'agrees') {
    if (Object.keys(measures).length === 0) return 'nothing'
    return `nothing. To tell differences half as large, run four times as long: --run-length ${Number((4 * runLength).toPrecision(6))}`
  }
  if (findings.length > 0) return findings[0].next
  if (exact !== undefined && Object.keys(measures).length === 0)
    return 'Say under "measures" what is asked of the model.'
  return exact === undefined
    ? 'For an exact answer, give each variable an upper bound ("to:") that it hardly ever reaches.'
    : 'nothing'
}
