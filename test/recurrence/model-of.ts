import { compile } from '../../src/model/compile.js'
import type { VariablesModel } from '../../src/model/model.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'

/** A model from the lines of a scenario file from `constants` or `time` on; the heading and a measure are added. */
export function modelOf(lines: string): VariablesModel {
  const indent = /^ *(?=\S)/m.exec(lines)?.[0].length ?? 0
  const body = lines.replace(new RegExp(`^ {${indent}}`, 'gm'), '')
  const text = [
    'stillmark: 1',
    'title: A model',
    'unit: hour',
    ...(/^time:/m.test(body) ? [] : ['time: continuous']),
    body,
    'measures: { any: { share: "1 == 1" } }',
  ].join('\n')
  const model = compile(parseScenario(text, { file: 'model.yaml' }))
  if (model.kind !== 'variables') throw new Error('a table')
  return model
}

/** Births and deaths of `n` on 0, 1, 2, …, in continuous time; expressions of n. */
export const birthDeath = (birth: string, death: string, constants = '{}', start = 0): VariablesModel =>
  modelOf(`
    constants: ${constants}
    state: { n: { from: 0, start: ${start} } }
    transitions:
      up: { rate: "${birth}", then: { n: n + 1 } }
      down: { when: n > 0, rate: "${death}", then: { n: n - 1 } }
  `)

/** The same in discrete time: 0 leads up surely, the rest of the probability stays. */
export const birthDeathSteps = (up: string, down: string, constants = '{}'): VariablesModel =>
  modelOf(`
    time: discrete
    remainder: stay
    constants: ${constants}
    state: { n: { from: 0, start: 0 } }
    transitions:
      bounce: { when: n == 0, probability: 1, then: { n: n + 1 } }
      up: { when: n > 0, probability: "${up}", then: { n: n + 1 } }
      down: { when: n > 0, probability: "${down}", then: { n: n - 1 } }
  `)
