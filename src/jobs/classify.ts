import { causesOf, isExpected } from './check.js'
import { withDeadline } from './deadline.js'
import { layGround } from './ground.js'
import type { JobResult } from './job-result.js'
import type { JobOptions } from './options.js'
import { detailsOf, scenarioPart } from './scenario-part.js'

/** Structure and recurrence, with the proof. */
export async function classify(file: string, options: JobOptions = {}): Promise<JobResult> {
  const report = withDeadline(options)
  const ground = await layGround(file, options, report.onProgress)
  const { scenario, part } = ground
  const open = part.recurrence === 'undetermined'
  const findings = causesOf(ground)
  const met = scenario.expect === undefined || isExpected(scenario.expect, part)
  return {
    document: {
      format: 'stillmark/classify/1',
      scenario: scenarioPart(scenario),
      structure: part,
      ...(findings.length === 0 ? {} : { findings }),
    },
    exitStatus: open ? 3 : met ? 0 : 1,
    details: {
      ...detailsOf(scenario, findings[0]?.next ?? 'nothing'),
      ...(scenario.expect === undefined || open ? {} : { expectationMet: met }),
    },
  }
}
