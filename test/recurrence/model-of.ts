import { compile } from '../../src/model/compile.js'
import type { VariablesModel } from '../../src/model/model.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'

/** A model from short lines: `state` and `transitions` as in a scenario file, constants as a map. */
export function modelOf(parts: {
  readonly time?: 'continuous' | 'discrete'
  readonly constants?: Readonly<Record<string, number | string>>
  readonly quantities?: Readonly<Record<string, string>>
  readonly state: Readonly<Record<string, object>>
  readonly transitions: Readonly<Record<string, object>>
  readonly remainder?: 'stay'
}): VariablesModel {
  const scenario = {
    stillmark: 1,
    title: 'A model',
    time: parts.time ?? 'continuous',
    unit: 'hour',
    ...(parts.constants === undefined ? {} : { constants: parts.constants }),
    ...(parts.quantities === undefined ? {} : { quantities: parts.quantities }),
    state: parts.state,
    transitions: parts.transitions,
    ...(parts.remainder === undefined ? {} : { remainder: parts.remainder }),
    measures: { any: { average: Object.keys(parts.state)[0] } },
  }
  const model = compile(parseScenario(JSON.stringify(scenario), { file: 'model.json' }))
  if (model.kind !== 'variables') throw new Error('a table')
  return model
}

/** Births and deaths of `n` on 0, 1, 2, …; expressions of n. */
export const birthDeath = (
  birth: string,
  death: string,
  more: Partial<Parameters<typeof modelOf>[0]> = {},
): VariablesModel =>
  modelOf({
    state: { n: { from: 0, start: 0 } },
    transitions: {
      up: { [more.time === 'discrete' ? 'probability' : 'rate']: birth, then: { n: 'n + 1' } },
      down: { when: 'n > 0', [more.time === 'discrete' ? 'probability' : 'rate']: death, then: { n: 'n - 1' } },
    },
    ...more,
  })
