import { withDeadline } from './deadline.js'
import { layGround } from './ground.js'
import type { JobResult } from './job-result.js'
import type { JobOptions } from './options.js'
import { detailsOf, scenarioPart } from './scenario-part.js'
import { openClass } from './sentences.js'

/** Structure and recurrence, with the proof. */
export async function classify(file: string, options: JobOptions = {}): Promise<JobResult> {
  const report = withDeadline(options)
  const { scenario, part } = await layGround(file, options, report.onProgress)
  const open = part.recurrence === 'undetermined'
  const met = scenario.expect === undefined || scenario.expect === part.recurrence
  return {
    document: {
      format: 'stillmark/classify/1',
      scenario: scenarioPart(scenario),
      structure: part,
      ...(open ? { findings: [openClass(part)] } : {}),
    },
    exitStatus: open ? 3 : met ? 0 : 1,
    details: {
      ...detailsOf(scenario, open ? openClass(part).next : 'nothing'),
      ...(scenario.expect === undefined || open ? {} : { expectationMet: met }),
    },
  }
}
