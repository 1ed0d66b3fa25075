import { compile } from '../../src/model/compile.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'
import type { ExactAnswer } from '../../src/stationary/exact-answer.js'
import { solveUnbounded } from '../../src/stationary/solve-unbounded.js'

/** The exact answer of a scenario from `state` on, with its class; undefined where there is none. */
export function unboundedAnswer(body: string, time = 'continuous'): ExactAnswer | undefined {
  const text = `stillmark: 1\ntitle: A model\ntime: ${time}\n${body}`
  const model = compile(parseScenario(text, { file: 'model.yaml' }))
  if (model.kind !== 'variables') throw new Error('a table')
  return solveUnbounded(model, classifyCountable(model, { withoutRemedies: true }))
}

/** Value and bound of a measure that is a number. */
export function numberIn(answer: ExactAnswer | undefined, name: string): { value: number; errorBound: number } {
  const measure = answer?.measures[name]
  if (measure === undefined || !('value' in measure)) throw new Error(`no value of ${name}`)
  return measure
}
