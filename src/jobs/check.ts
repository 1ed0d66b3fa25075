import { shownState } from '../chain/shown-state.js'
import { adjustedConfidence, compareRun } from '../comparison/compare-run.js'
import type { StructureFacts } from '../comparison/structure-findings.js'
import type { Comparison } from '../comparison/verdict.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import { solve } from '../stationary/solve.js'
import { chooseRun } from './choose-run.js'
import { withDeadline } from './deadline.js'
import type { StillmarkDocument } from './document.js'
import { adjustedEstimates } from './estimates.js'
import { exactPart } from './exact-part.js'
import { type Ground, layGround } from './ground.js'
import type { JobResult } from './job-result.js'
import { knownTimeAverages, predictionsOf } from './known-dynamics.js'
import type { JobOptions } from './options.js'
import { runRequest } from './run-request.js'
import { runSimulation } from './run-simulation.js'
import { claimsToJudge, detailsOf, scenarioPart } from './scenario-part.js'
import { explain, openClass } from './sentences.js'

/** The main job: structure, exact answer, simulation, comparison, claims. */
export async function check(file: string, options: JobOptions = {}): Promise<JobResult> {
  const report = withDeadline(options)
  const ground = await layGround(file, options, report.onProgress)
  const exact = exactAnswer(ground, options, report)
  const request = runRequest(ground.scenario, options)
  const averages = knownTimeAverages(ground, exact)
  const chosen = await chooseRun(ground, exact, averages, request, report)
  const simulated = await runSimulation(ground, chosen, request, report)
  report.onProgress({ stage: 'comparing' })
  const { settings } = chosen
  const confidence = adjustedConfidence(request.confidence, ground.model.measures.length)
  const comparison = compareRun({
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
    causes: ground.part.recurrence === 'undetermined' ? [openClass(ground.part)] : [],
  })
  const document: StillmarkDocument = {
    format: 'stillmark/check/1',
    scenario: scenarioPart(ground.scenario),
    structure: ground.part,
    ...exactPart(exact, () => explain(ground.part)),
    simulation: simulated.part,
    comparison,
  }
  return {
    document,
    exitStatus: exitStatusOf(ground, comparison),
    details: {
      ...detailsOf(ground.scenario, nextOf(comparison), request),
      warmUpBasis: chosen.warmUpBasis,
      runLengthBasis: chosen.runLengthBasis,
      ...(ground.scenario.expect === undefined || ground.part.recurrence === 'undetermined'
        ? {}
        : { expectationMet: ground.scenario.expect === ground.part.recurrence }),
    },
  }
}

/** The exact long-run answer, or undefined where the model is not known to have one. */
export function exactAnswer(
  { model, finite }: Ground,
  options: JobOptions,
  { onProgress, signal }: ReturnType<typeof withDeadline>,
): ExactAnswer | undefined {
  if (finite === undefined) return undefined
  onProgress({ stage: 'solving' })
  return solve(model, finite.chain, finite.joined, finite.structure, {
    maxMemoryBytes: options.maxMemoryBytes,
    signal,
    onProgress: (done) => onProgress({ stage: 'solving', done: Math.round(1000 * done), of: 1000 }),
  })
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

/** An expectation that the structure contradicts is a disagreement, whatever the numbers say. */
function exitStatusOf({ scenario, part }: Ground, { verdict }: Comparison): 0 | 1 | 3 {
  const { expect } = scenario
  if (expect !== undefined && part.recurrence !== 'undetermined' && expect !== part.recurrence) return 1
  return verdict === 'agrees' ? 0 : verdict === 'undecided' ? 3 : 1
}

function nextOf({ findings, verdict }: Comparison): string {
  return verdict === 'agrees' || findings.length === 0 ? 'nothing' : findings[0].next
}
