import { causesOf, isExpected } from './check.js'
import { withDeadline } from './deadline.js'
import { exactAnswer } from './exact-answer.js'
import { exactPart } from './exact-part.js'
import { layGround } from './ground.js'
import type { JobResult } from './job-result.js'
import type { JobOptions } from './options.js'
import { detailsOf, scenarioPart } from './scenario-part.js'

/** Exact long-run measures with error bounds. */
export async function solve(file: string, options: JobOptions = {}): Promise<JobResult> {
  const report = withDeadline(options)
  const ground = await layGround(file, options, report.onProgress)
  const { scenario, part, finite } = ground
  const { exact, absent } = exactAnswer(ground, options, report)
  const open = part.recurrence === 'undetermined'
  const findings = causesOf(ground)
  const met = scenario.expect === undefined || open || isExpected(scenario.expect, part)
  return {
    document: {
      format: 'stillmark/solve/1',
      scenario: scenarioPart(scenario),
      structure: part,
      ...exactPart(exact, absent, options.states ? finite?.chain : undefined),
      ...(findings.length === 0 ? {} : { findings }),
    },
    // A proved steady state that can't be solved here stays undecided; without one there is nothing to solve.
    exitStatus: open ? 3 : !met ? 1 : exact !== undefined ? 0 : part.recurrence === 'positive recurrent' ? 3 : 1,
    details: detailsOf(scenario, findings[0]?.next ?? 'nothing'),
  }
}
