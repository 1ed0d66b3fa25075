import { chooseRun } from './choose-run.js'
import { withDeadline } from './deadline.js'
import { layGround } from './ground.js'
import type { JobResult } from './job-result.js'
import type { JobOptions } from './options.js'
import { runRequest } from './run-request.js'
import { runSimulation } from './run-simulation.js'
import { detailsOf, scenarioPart } from './scenario-part.js'
import { openClass } from './sentences.js'

/** Seeded replications and intervals; nothing is solved. */
export async function simulate(file: string, options: JobOptions = {}): Promise<JobResult> {
  const report = withDeadline(options)
  const ground = await layGround(file, options, report.onProgress)
  const request = runRequest(ground.scenario, options)
  const chosen = await chooseRun(ground, undefined, {}, request, report)
  const { part } = await runSimulation(ground, chosen, request, report)
  const open = ground.part.recurrence === 'undetermined'
  return {
    document: {
      format: 'stillmark/simulate/1',
      scenario: scenarioPart(ground.scenario),
      structure: ground.part,
      simulation: part,
      ...(open ? { findings: [openClass(ground.part)] } : {}),
    },
    exitStatus: open ? 3 : 0,
    details: {
      ...detailsOf(ground.scenario, open ? openClass(ground.part).next : 'nothing', request),
      warmUpBasis: chosen.warmUpBasis,
      runLengthBasis: chosen.runLengthBasis,
    },
  }
}
