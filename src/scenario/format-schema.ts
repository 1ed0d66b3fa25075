import { z } from 'zod'

/**
 * The shape of a scenario file, format 1: which keys there are and what kind of value each takes. What the values mean
 * (names, bounds, sums to 1) is checked after it. The JSON Schema for editors is made from this.
 */

const scalar = z.union([z.string(), z.number(), z.boolean()])
const expression = scalar.describe('A number or an expression.')
const constantExpression = scalar.describe('A number or an expression over constants.')
const constant = z
  .union([scalar, z.array(scalar)])
  .describe('A number, a fraction 1/3, a percentage 2.5 %, or a list of them.')

const range = z.strictObject({ from: constantExpression, to: constantExpression })

const stateVariable = z.strictObject({
  index: range.optional().describe('Makes the variable an array; its elements are counted from `from`.'),
  from: constantExpression.optional().describe('Lowest value; without it there is none.'),
  to: constantExpression.optional().describe('Highest value; without it there is none.'),
  start: z
    .union([scalar, z.array(scalar)])
    .optional()
    .describe('Value at the start, one for all elements or a list.'),
})

const transition = z.strictObject({
  each: z.record(z.string(), range).optional().describe('Repeats the transition for every value of an index.'),
  when: expression.optional().describe('Condition under which it can fire; true if left out.'),
  rate: expression.optional().describe('Continuous time: firings per time unit.'),
  probability: expression.optional().describe('Discrete time: probability in one step.'),
  // `null` is an empty value, which is taken as { }.
  // biome-ignore lint/suspicious/noThenProperty: `then` is a key of the file format
  then: z
    .record(z.string(), expression)
    .nullable()
    .optional()
    .describe('New values; the right sides see the old state.'),
})

const byState = z.record(z.string(), scalar).describe('A value for each state of a table; what is left out is 0.')
const moves = z
  .strictObject({ from: scalar.optional(), to: scalar.optional() })
  .describe('Moves between states of a table; one side may be left out.')
const listOfStates = z.array(scalar).describe('States of a table.')
const subject = z.union([scalar, listOfStates, moves, byState])

const measure = z.strictObject({
  average: z.union([scalar, byState]).optional().describe('Long-run average over time.'),
  share: z.union([scalar, listOfStates]).optional().describe('Long-run share of time in which a condition holds.'),
  frequency: z.union([scalar, moves]).optional().describe('Long-run firings per time unit.'),
  ratio: z.array(subject).optional().describe('Two frequencies or averages, one divided by the other.'),
  quantile: z.union([scalar, byState]).optional().describe('Smallest value v with share(expression <= v) >= level.'),
  level: scalar.optional().describe('Of the quantile, between 0 and 1.'),
  distribution: z.union([scalar, byState]).optional().describe('Long-run share of time of every value.'),
})

const claim = z.strictObject({
  value: scalar.describe('The claimed value; a number, a fraction or a percentage.'),
  tolerance: scalar.optional().describe('Percent: relative to the exact value; a plain number: absolute.'),
  source: scalar.optional().describe('Where the claim comes from.'),
})

const simulation = z.strictObject({
  seed: scalar.optional().describe('A phrase.'),
  replications: scalar.optional(),
  'run-length': scalar.optional().describe('Time units that each replication observes.'),
  'warm-up': scalar.optional().describe('auto, a length in time units, or the name of a rule.'),
  confidence: scalar.optional().describe('Between 0 and 1, or a percentage.'),
  tolerance: scalar.optional().describe('The difference that matters in practice.'),
})

const table = z.record(z.string(), z.record(z.string(), constantExpression).nullable())

export const expectations = ['positive recurrent', 'null recurrent', 'transient', 'mixed', 'explosive'] as const

export const scenarioSchema = z.strictObject({
  stillmark: z.literal(1).describe('The format of this file.'),
  title: scalar,
  time: z.enum(['continuous', 'discrete']),
  unit: scalar.optional().describe('Label of one time unit (of one step, where discrete).'),
  constants: z.record(z.string(), constant).optional(),
  quantities: z.record(z.string(), expression).optional().describe('Named expressions over constants and state.'),
  state: z.record(z.string(), stateVariable).optional().describe('Integer variables.'),
  transitions: z.record(z.string(), transition).optional(),
  remainder: z.enum(['stay']).optional().describe('Discrete time: the rest of the probability stays.'),
  states: listOfStates.optional(),
  probabilities: table.optional(),
  rates: table.optional(),
  matrix: z.string().optional().describe('A Matrix Market (.mtx) or .csv file beside this one.'),
  start: scalar.optional().describe('Start state of a table.'),
  measures: z.record(z.string(), measure).optional(),
  claims: z.record(z.string(), claim).optional(),
  simulation: simulation.optional(),
  expect: z.enum(expectations).optional().describe('What the modeller believes.'),
})

/** JSON Schema (draft 2020-12) of the format, for editors. */
export function jsonSchema(): Record<string, unknown> {
  return {
    ...z.toJSONSchema(scenarioSchema),
    title: 'Stillmark scenario, format 1',
  }
}
