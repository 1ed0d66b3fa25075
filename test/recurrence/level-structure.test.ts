import { describe, expect, test } from 'vitest'
import type { VariablesModel } from '../../src/model/model.js'
import { add, type Fraction, toText, zero } from '../../src/numbers/fraction.js'
import { type LevelStructure, stateAt } from '../../src/recurrence/classification.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { birthDeath, modelOf } from './model-of.js'

const structureOf = (model: VariablesModel) => classifyCountable(model, { withoutRemedies: true }).structure

/** Moves of the structure out of a state of a level (undefined: the boundary), as state → rate. */
function movesFrom(structure: LevelStructure, level: number | undefined, index: number): Map<string, Fraction> {
  const moves = new Map<string, Fraction>()
  const put = (state: readonly number[], rate: Fraction) => {
    if (rate.numerator !== 0n) moves.set(state.join(' '), add(moves.get(state.join(' ')) ?? zero, rate))
  }
  if (level === undefined) {
    for (const { from, to, exact } of structure.insideBoundary) if (from === index) put(structure.boundary[to], exact)
    for (const { from, to, exact } of structure.boundaryUp) if (from === index) put(stateAt(structure, 0, to), exact)
    return moves
  }
  const m = structure.phases.length
  for (let to = 0; to < m; to++) {
    put(stateAt(structure, level + 1, to), structure.up.exact[index * m + to])
    if (to !== index) put(stateAt(structure, level, to), structure.local.exact[index * m + to])
    if (level > 0) put(stateAt(structure, level - 1, to), structure.down.exact[index * m + to])
  }
  if (level === 0)
    for (const { from, to, exact } of structure.boundaryDown) if (from === index) put(structure.boundary[to], exact)
  return moves
}

/** The model's own moves, without those that stay. */
function ownMoves(model: VariablesModel, state: readonly number[]): Map<string, Fraction> {
  const moves = new Map<string, Fraction>()
  for (const { rate, next } of model.expandExactly(state)) {
    const key = next.join(' ')
    if (key !== state.join(' ')) moves.set(key, add(moves.get(key) ?? zero, rate as Fraction))
  }
  return moves
}

const shown = (moves: ReadonlyMap<string, Fraction>) =>
  [...moves].map(([state, rate]) => `${state}: ${toText(rate)}`).sort()

const models: Record<string, VariablesModel> = {
  'three servers': birthDeath('2.9', 'min(n, 3)'),
  'batches of three, up to two at a time': modelOf(`
    state: { n: { from: 0, start: 0 } }
    transitions:
      come: { rate: 1/2, then: { n: n + 3 } }
      go: { when: n > 0, rate: 1, then: { n: "max(n - 2, 0)" } }
  `),
  'an empty dock takes a whole convoy': modelOf(`
    state: { n: { from: 0, start: 0 } }
    transitions:
      convoy: { when: n == 0, rate: 1, then: { n: 11 } }
      come: { rate: 1/2, then: { n: n + 1 } }
      go: { when: n > 0, rate: 1, then: { n: n - 1 } }
  `),
  'a machine that breaks down only while it works': modelOf(`
    state: { n: { from: 0, start: 4 }, up: { from: 0, to: 1, start: 1 } }
    transitions:
      come: { rate: 1/4, then: { n: n + 1 } }
      go: { when: n > 0 and up == 1, rate: 1, then: { n: n - 1 } }
      fail: { when: up == 1 and n > 0, rate: 1/6, then: { up: 0 } }
      mend: { when: up == 0, rate: 1/3, then: { up: 1 } }
  `),
  'every other value': modelOf(`
    state: { n: { from: 0, start: 0 } }
    transitions:
      come: { rate: 1/4, then: { n: n + 4 } }
      go: { when: n > 0, rate: 1, then: { n: n - 2 } }
  `),
  'pulled to the middle from both sides': modelOf(`
    state: { n: { start: 3 } }
    transitions:
      up: { rate: "if(n > 2, 1, 2)", then: { n: n + 1 } }
      down: { rate: "if(n > 2, 3, 1)", then: { n: n - 1 } }
  `),
  'a start that is never seen again': modelOf(`
    state: { n: { from: 0, start: 0 }, mood: { from: 0, to: 2, start: 0 } }
    transitions:
      leave: { when: mood == 0, rate: 5, then: { mood: 1 } }
      swing: { when: mood > 0, rate: 1, then: { mood: 3 - mood } }
      come: { rate: mood/3, then: { n: n + 1 } }
      go: { when: n > 0, rate: 1, then: { n: n - 1 } }
  `),
  'steps with phases of the count': modelOf(`
    time: discrete
    remainder: stay
    state: { n: { from: 0, start: 0 } }
    transitions:
      up: { probability: "if(n % 2 == 0, 1/5, 1/10)", then: { n: n + 1 } }
      down: { when: n > 0, probability: 1/5, then: { n: n - 1 } }
  `),
}

describe.each(Object.entries(models))('%s', (_name, model) => {
  const structure = structureOf(model)
  if (structure?.form !== 'levels') throw new Error(`no levels: ${structure?.form}`)

  test('levels 0 to 5 and the boundary move as the model does, to the last digit', () => {
    structure.boundary.forEach((state, k) => {
      expect(shown(movesFrom(structure, undefined, k))).toEqual(shown(ownMoves(model, state)))
    })
    for (let level = 0; level <= 5; level++) {
      structure.phases.forEach((_, phase) => {
        const state = stateAt(structure, level, phase)
        expect(shown(movesFrom(structure, level, phase))).toEqual(shown(ownMoves(model, state)))
      })
    }
  })

  test('no state stands twice', () => {
    const all = [...structure.boundary.map(String)]
    for (let level = 0; level <= 3; level++)
      for (const phase of structure.phases.keys()) all.push(String(stateAt(structure, level, phase)))
    expect(new Set(all).size).toBe(all.length)
  })
})

describe('birth-death forms', () => {
  test('rates below the level stand in a table, beyond it as rational functions', () => {
    const structure = structureOf(birthDeath('3', 'min(n, 2) + n/4'))
    expect(structure).toMatchObject({ form: 'birth-death', first: 0, beyond: 3, outward: 1 })
    if (structure?.form !== 'birth-death') return
    expect(structure.birthBelow.map(toText)).toEqual(['3', '3', '3'])
    expect(structure.deathBelow.map(toText)).toEqual(['0', '5/4', '5/2'])
    expect(structure.death.numerator.map(toText)).toEqual(['2', '1/4'])
    expect(structure.death.denominator.map(toText)).toEqual(['1'])
  })

  test('a model of levels that moves by one has that form too', () => {
    const structure = structureOf(birthDeath('1/2', '1'))
    expect(structure).toMatchObject({ form: 'levels', birthDeath: { first: 0, beyond: 1 } })
  })

  test('the class may begin above the start', () => {
    const structure = structureOf(birthDeath('3', 'if(n < 5, 0, n)'))
    expect(structure).toMatchObject({ form: 'birth-death', first: 4 })
  })
})
