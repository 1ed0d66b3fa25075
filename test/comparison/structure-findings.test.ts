import { expect, test } from 'vitest'
import { type StructureFacts, structureFindings } from '../../src/comparison/structure-findings.js'

type Part = StructureFacts['classes'][number]
const part = (more: Partial<Part> = {}): Part => ({
  size: 3,
  period: 1,
  reachedWith: 1,
  example: 'keen',
  measures: {},
  ...more,
})
const facts = (classes: Part[], more: Partial<StructureFacts> = {}): StructureFacts => ({
  classes,
  transientStates: 0,
  meanTimeToSettle: 0,
  ...more,
})

test('one closed class without a period: nothing to be said', () => {
  expect(structureFindings(facts([part()]), 'day')).toEqual([])
  expect(structureFindings(facts([part()], { transientStates: 5, meanTimeToSettle: 3 }), 'day')).toEqual([])
  expect(structureFindings(facts([part(), part({ reachedWith: 0, period: 2 })]), 'day')).toEqual([])
})
test('periodic', () => {
  expect(structureFindings(facts([part({ period: 3 })]), 'day')).toEqual([
    {
      code: 'periodic',
      says: 'The model goes round with period 3.',
      evidence:
        'Each state can be met only every 3 steps, so the distribution over the states never settles; averages over time do, and they are what is compared here.',
      next: 'Do not sample every 3 steps (or a multiple), and do not read a single late step as the steady state.',
    },
  ])
  expect(structureFindings(facts([part({ period: 2 })]), 'day')).toHaveLength(1)
})
test('absorbing: one state for good, after some time', () => {
  const one = part({ size: 1, example: { up: 0, spares: [1, 2] } })
  const given = { transientStates: 2, meanTimeToSettle: 12.5 }
  expect(structureFindings(facts([one], given), 'day')).toEqual([
    {
      code: 'absorbing',
      says: 'The run ends in one state for good: up 0, spares 1 2.',
      evidence:
        'It is entered after 12.5 days on average, and nothing leads out of it. Every long-run value is that of this state.',
      next: 'If the plant goes on after that, add the transition that leads out; if the time until then is asked for, long-run averages do not answer it.',
      states: [{ up: 0, spares: [1, 2] }],
    },
  ])
  // A model of one state only, or one that starts there, ends nowhere.
  expect(structureFindings(facts([one]), 'day')).toEqual([])
  expect(structureFindings(facts([one], { transientStates: 2 }), 'day')).toEqual([])
  expect(structureFindings(facts([part({ size: 2 })], given), 'day')).toEqual([])
})
test('start-dependent: each part with its probability and its values', () => {
  const [finding] = structureFindings(
    facts(
      [
        part({ reachedWith: 0.6, example: 'north', measures: { late: 1 / 7, stock: 2, cost: 3, extra: 4 } }),
        part({ reachedWith: 0.4, size: 1, example: { site: 2 } }),
        part({ reachedWith: 0 }),
      ],
      { transientStates: 1, meanTimeToSettle: 1 },
    ),
    'week',
  )
  expect(finding).toEqual({
    code: 'start-dependent',
    says: 'The run ends in one of 2 parts of the model and never leaves it, so one long run shows one of them only.',
    evidence:
      'It ends with probability 0.6 in 3 states around "north" (late 0.1429, stock 2, cost 3); with probability 0.4 in the state site 2. It is settled after 1 week on average. The exact values are the mixture.',
    next: 'Compare within one part, by starting there; or run many replications: for the mixture only their number counts, not their length.',
    states: ['north', { site: 2 }],
  })
})
test('of many parts four are shown', () => {
  const [finding] = structureFindings(
    facts(Array.from({ length: 6 }, (_, i) => part({ reachedWith: 1 / 6, size: 1200, example: `p${i}` }))),
    'week',
  )
  expect(finding.evidence).toMatch(/in 1,200 states around "p3"; and 2 more\. The exact values are the mixture\.$/)
  expect(finding.states).toEqual(['p0', 'p1', 'p2', 'p3'])
  const [four] = structureFindings(facts(Array.from({ length: 4 }, () => part({ reachedWith: 0.25 }))), 'week')
  expect(four.evidence).not.toMatch(/more/)
})
