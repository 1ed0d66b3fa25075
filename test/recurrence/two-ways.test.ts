import seedrandom from 'seedrandom'
import { expect, test } from 'vitest'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { birthDeath, modelOf } from './model-of.js'

const plain = { withoutRemedies: true }

// A phase that switches without touching the rates changes no class, but takes the model from the series of Karlin and
// McGregor to Foster's and Lamperti's criteria: two theorems that must not contradict each other.
test('a phase that does nothing never changes a proved class, in 200 random models with rates that depend on the count', () => {
  const random = seedrandom('two-ways')
  const below = (n: number): number => Math.floor(random() * n)
  const tally = new Map<string, number>()
  for (let round = 0; round < 200; round++) {
    const power = below(3)
    const scale = power === 0 ? '1' : power === 1 ? '(n + 1)' : '(n + 1)^2'
    // Half of the models are balanced in their leading terms, so that the next ones decide.
    const [up, down] = round % 2 === 0 ? [1, 1] : [1 + below(3), 1 + below(3)]
    const [a, b] = [below(9) / 2, below(9) / 2]
    const birth = `${scale}*(${up} + ${a}/(n + 2))`
    const death = `${scale}*(${down} + ${b}/(n + 3))`
    const single = classifyCountable(birthDeath(birth, death), plain)
    const phases = modelOf(`
      state: { n: { from: 0, start: 0 }, idle: { from: 0, to: 1, start: 0 } }
      transitions:
        up: { rate: "${birth}", then: { n: n + 1 } }
        down: { when: n > 0, rate: "${death}", then: { n: n - 1 } }
        turn: { rate: "${scale}", then: { idle: 1 - idle } }
    `)
    const doubled = classifyCountable(phases, plain)
    expect([round, single.grade]).toEqual([round, 'proved'])
    if (doubled.grade === 'open') {
      tally.set('open', (tally.get('open') ?? 0) + 1)
      continue
    }
    expect([round, doubled.recurrence, doubled.explosive ?? false]).toEqual([
      round,
      single.recurrence,
      single.explosive ?? false,
    ])
    tally.set(single.recurrence, (tally.get(single.recurrence) ?? 0) + 1)
  }
  expect(tally.get('positive recurrent')).toBeGreaterThan(40)
  expect(tally.get('transient')).toBeGreaterThan(40)
  expect(tally.get('null recurrent')).toBeGreaterThan(5)
  expect(tally.get('open') ?? 0).toBeLessThan(60)
}, 60_000)
