import { readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import type { VariablesModel } from '../../src/model/model.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { birthDeath, modelOf } from '../recurrence/model-of.js'

interface Case {
  readonly id: string
  readonly what: string
  readonly model: Readonly<Record<string, string | number>>
  readonly values: Readonly<Record<string, string | boolean | readonly string[]>>
  readonly source: string
}

const { cases } = JSON.parse(readFileSync(new URL('./references/countable-chains.json', import.meta.url), 'utf8')) as {
  readonly cases: readonly Case[]
}

function modelOfCase({ model, id }: Case): VariablesModel {
  switch (model.type) {
    case 'birth-death dtmc':
      return modelOf(`
        time: discrete
        constants: { c: ${model.c}, k: ${model.shift} }
        state: { x: { from: 0, start: 0 } }
        transitions:
          bounce: { when: x == 0, probability: 1, then: { x: 1 } }
          up: { when: x > 0, probability: (1 + c/(x + k))/2, then: { x: x + 1 } }
          down: { when: x > 0, probability: (1 - c/(x + k))/2, then: { x: x - 1 } }
      `)
    case 'M/M/1':
      return birthDeath('arrivals', 'service', `{ arrivals: ${model.arrivalRate}, service: ${model.serviceRate} }`)
    case 'birth-death ctmc':
      return birthDeath(`${model.birth}`, `${model.death}`)
    case 'pure birth ctmc':
      return birthDeath(`${model.rate}`, '0')
    case 'random walk': {
      const d = Number(model.dimension)
      const axes = Array.from({ length: d }, (_, k) => `x${k}`)
      return modelOf(
        [
          'time: discrete',
          `state: { ${axes.map((x) => `${x}: { start: 0 }`).join(', ')} }`,
          'transitions:',
          ...axes.flatMap((x) => [
            `  up_${x}: { probability: 1/${2 * d}, then: { ${x}: ${x} + 1 } }`,
            `  down_${x}: { probability: 1/${2 * d}, then: { ${x}: ${x} - 1 } }`,
          ]),
        ].join('\n'),
      )
    }
    case 'quarter-plane ctmc':
      return 'lambda' in model
        ? modelOf(`
            state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 } }
            transitions:
              come: { rate: ${model.lambda}, then: { x: x + 1 } }
              pass: { when: x > 0, rate: ${model.mu1}, then: { x: x - 1, y: y + 1 } }
              go: { when: y > 0, rate: ${model.mu2}, then: { y: y - 1 } }
          `)
        : modelOf(`
            state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 } }
            transitions:
              come1: { rate: ${model.lambda1}, then: { x: x + 1 } }
              come2: { rate: ${model.lambda2}, then: { y: y + 1 } }
              go1: { when: x > 0, rate: "if(y > 0, ${model.mu1}, ${model.alone1})", then: { x: x - 1 } }
              go2: { when: y > 0, rate: "if(x > 0, ${model.mu2}, ${model.alone2})", then: { y: y - 1 } }
          `)
    default:
      throw new Error(`${id}: a model of a new type`)
  }
}

const theorems: Readonly<Record<string, RegExp>> = {
  'birth-death dtmc': /Karlin and McGregor 1957|Neuts 1981/,
  'M/M/1': /Neuts 1981/,
  'birth-death ctmc': /Karlin and McGregor 1957/,
  'pure birth ctmc': /Feller 1968 and Reuter 1957/,
  'random walk': /Pólya 1921|Neuts 1981/,
  'quarter-plane ctmc': /Jackson 1957|Fayolle, Malyshev and Menshikov 1995|Goodman and Massey 1984/,
}

describe.each(cases)('$id ($source)', (own) => {
  const found = classifyCountable(modelOfCase(own))
  const { values, model } = own
  const predicted = (name: string): number | undefined => found.growth?.find((each) => each.name === name)?.value

  test(`the class is ${values.class}, proved, the theorem named`, () => {
    const explosive = values.class === 'explosive'
    expect([found.recurrence, found.grade]).toEqual([explosive ? 'transient' : values.class, 'proved'])
    expect(found.explosive ?? false).toBe(explosive)
    expect(found.basis).toMatch(theorems[`${model.type}`])
  })

  if ('period' in model) {
    test(`the period is ${model.period}`, () =>
      expect(found.closedClasses).toEqual([{ size: null, period: model.period }]))
  }

  const limits: readonly (readonly [string, string])[] = [
    ['limit_E_N_over_sqrt_t', 'growth_n'],
    ['limit_E_Xn_over_sqrt_n', 'growth_x'],
    ['speed', 'speed_n'],
    ['limit_E_X_over_t', 'speed_n'],
  ]
  for (const [value, name] of limits) {
    if (value in values) {
      test(`${name} is ${values[value]} to 1e-12`, () => {
        expect(predicted(name)).toBeDefined()
        expect(Math.abs((predicted(name) as number) / Number(values[value]) - 1)).toBeLessThan(1e-12)
      })
    }
  }

  // From 0 the first move leads to 1, so the chance of never coming back is that from 1; returns are geometric.
  if ('probNeverEmptyAgainFrom1' in values) {
    test('the expected number of returns follows from the chance of never coming back', () => {
      const never = Number(values.probNeverEmptyAgainFrom1)
      expect(Math.abs((predicted('returns') as number) / ((1 - never) / never) - 1)).toBeLessThan(1e-12)
    })
  }
  if ('expectedVisits' in values) {
    test('expected visits are one more than the returns', () => {
      expect(Math.abs((predicted('returns') as number) + 1 - Number(values.expectedVisits))).toBeLessThan(1e-12)
    })
  }
  if ('driftInterior' in values) {
    const { structure, drift } = found
    if (structure?.form !== 'quarter-plane') return
    test.each([
      ['inside', 'driftInterior'],
      ['along x', 'driftOnXAxis'],
      ['along y', 'driftOnYAxis'],
    ])('the mean drift %s is that of the reference', (where, name) => {
      const own = drift?.filter((each) => each.where === where).map(({ value }) => value)
      expect(own).toEqual((values[name] as readonly string[]).map(Number))
    })
  }
})
