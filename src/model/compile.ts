import { StillmarkError } from '../errors/stillmark-error.js'
import { type Fraction, toNumber } from '../numbers/fraction.js'
import type { Expression } from '../scenario/expression.js'
import type { Measure, Scenario, Side, StateVariable, Subject, TableBody, VariablesBody } from '../scenario/scenario.js'
import { copiesOf } from './copies.js'
import { type ExactValue, exactFallback, exactValues, StateFault } from './exact-fallback.js'
import { compileExpand } from './expand.js'
import { expandExactlyWith } from './expand-exactly.js'
import { firingWeights } from './firing-weights.js'
import { emit, newCode } from './generated-code.js'
import { build, type Compilation, declareQuantities } from './generated-function.js'
import type { CompiledMeasure, Functional, Label, Model, StateValue, TableModel, VariablesModel } from './model.js'

export { newMoves } from './expand.js'

/** @throws StillmarkError where the scenario can't be compiled: too many copies of a transition */
export function compile(scenario: Scenario): Model {
  return scenario.body.kind === 'table'
    ? compileTable(scenario, scenario.body)
    : compileVariables(scenario, scenario.body)
}

function compileVariables(scenario: Scenario, body: VariablesBody): VariablesModel {
  const offsets = new Map<string, { offset: number; declared: StateVariable }>()
  const elements: string[] = []
  const lower: number[] = []
  const upper: number[] = []
  const start: number[] = []
  for (const declared of body.variables) {
    offsets.set(declared.name, { offset: elements.length, declared })
    declared.start.forEach((value, i) => {
      elements.push(declared.index === undefined ? declared.name : `${declared.name}[${declared.index.from + i}]`)
      lower.push(declared.from ?? Number.NEGATIVE_INFINITY)
      upper.push(declared.to ?? Number.POSITIVE_INFINITY)
      start.push(value)
    })
  }
  const exact = exactValues(scenario, offsets)
  const labels: Label[] = body.transitions.flatMap((rule) =>
    copiesOf(scenario, rule).map((copy) => ({ transition: rule.name, copy })),
  )
  const describe = (state: ArrayLike<number>): string =>
    body.variables
      .map(({ name, start: own }) => {
        const { offset } = offsets.get(name) as { offset: number }
        return `${name} ${Array.from({ length: own.length }, (_, i) => state[offset + i]).join(' ')}`
      })
      .join(', ')
  const base = {
    scenario,
    body,
    offsets,
    elements,
    lower: Float64Array.from(lower),
    upper: Float64Array.from(upper),
    labels,
    exact,
    describe,
  }
  const evaluate = valueCompiler(scenario, offsets, exact, describe)
  return {
    kind: 'variables',
    scenario,
    title: scenario.title,
    time: scenario.time,
    unit: scenario.unit,
    width: elements.length,
    elements,
    lower: base.lower,
    upper: base.upper,
    start: Float64Array.from(start),
    labels,
    irrational: mayBeIrrational(scenario, body),
    expand: compileExpand(base),
    expandExactly: expandExactlyWith(base),
    describe,
    measures: scenario.measures.map((measure) =>
      compiledMeasure(measure, {
        value: (subject, key) => evaluate(expressionOf(subject), key),
        functional: ({ kind, of }, key) =>
          kind === 'frequency'
            ? { kind, weights: firingWeights(scenario, expressionOf(of), labels) }
            : { kind, value: evaluate(expressionOf(of), key) },
      }),
    ),
  }
}

function compileTable(scenario: Scenario, body: TableBody): TableModel {
  const merged = new Map<number, { from: number; to: number; value: Fraction }>()
  const n = body.states.length
  for (const { from, to, value } of body.entries) {
    if (value.numerator === 0n) continue
    const known = merged.get(from * n + to)
    if (known === undefined) merged.set(from * n + to, { from, to, value })
    else known.value = sum(known.value, value)
  }
  const entries = [...merged.values()].sort((a, b) => a.from - b.from || a.to - b.to)
  const values = (subject: Subject): StateValue => {
    const of = subject as Extract<Subject, { kind: 'states' }>
    const numbers = Float64Array.from(of.values, toNumber)
    return {
      valueOf: (state) => numbers[state[0]],
      errorOf: (state) => (isDouble(of.values[state[0]]) ? 0 : Math.abs(numbers[state[0]]) * 2 ** -53 + 5e-324),
      exactOf: (state) => of.values[state[0]],
    }
  }
  return {
    kind: 'table',
    scenario,
    title: scenario.title,
    time: scenario.time,
    unit: scenario.unit,
    states: body.states,
    start: body.start,
    entries,
    measures: scenario.measures.map((measure) =>
      compiledMeasure(measure, {
        value: values,
        functional: ({ of }) =>
          of.kind === 'moves' ? { kind: 'moves', from: of.from, to: of.to } : { kind: 'average', value: values(of) },
      }),
    ),
  }
}

const sum = (a: Fraction, b: Fraction): Fraction => {
  const numerator = a.numerator * b.denominator + b.numerator * a.denominator
  return { numerator, denominator: a.denominator * b.denominator }
}

/** Fractions with a denominator that is a power of two and few digits are doubles as they stand. */
const isDouble = ({ numerator, denominator }: Fraction): boolean =>
  (denominator & (denominator - 1n)) === 0n &&
  numerator < 2n ** 53n &&
  numerator > -(2n ** 53n) &&
  denominator < 2n ** 1000n

const expressionOf = (subject: Subject): Expression => (subject as Extract<Subject, { kind: 'expression' }>).of

interface MeasureParts {
  readonly value: (subject: Subject, key: string) => StateValue
  readonly functional: (side: Side, key: string) => Functional
}

function compiledMeasure(measure: Measure, { value, functional }: MeasureParts): CompiledMeasure {
  const { name } = measure
  const key = `measures.${name}`
  switch (measure.kind) {
    case 'average':
      return { name, kind: 'average', of: functional({ kind: 'average', of: measure.of }, key) }
    case 'share':
      return { name, kind: 'share', of: truthOf(functional({ kind: 'average', of: measure.of }, key)) }
    case 'frequency':
      return { name, kind: 'frequency', of: functional({ kind: 'frequency', of: measure.of }, key) }
    case 'ratio':
      return { name, kind: 'ratio', top: functional(measure.top, key), bottom: functional(measure.bottom, key) }
    case 'quantile':
      return { name, kind: 'quantile', value: value(measure.of, key), level: toNumber(measure.level) }
    case 'distribution':
      return { name, kind: 'distribution', value: value(measure.of, key) }
  }
}

/** A share is of the time in which something holds: any number but 0 counts as holding. */
function truthOf(of: Functional): Functional {
  if (of.kind !== 'average') return of
  const { value: counted } = of
  const holds = (state: ArrayLike<number>): boolean => {
    const value = counted.valueOf(state)
    const error = counted.errorOf(state)
    if (error === 0 || Math.abs(value) > error) return value !== 0
    const exact = counted.exactOf(state)
    return exact === undefined ? value !== 0 : exact.numerator !== 0n
  }
  return {
    kind: 'average',
    value: {
      valueOf: (state) => (holds(state) ? 1 : 0),
      errorOf: () => 0,
      exactOf: (state) => ({ numerator: holds(state) ? 1n : 0n, denominator: 1n }),
    },
  }
}

/** Compiles expressions over the state into functions that give value and error bound. */
function valueCompiler(
  scenario: Scenario,
  offsets: Compilation['offsets'],
  exact: ExactValue,
  describe: Compilation['describe'],
): (expression: Expression, key: string) => StateValue {
  return (expression, key) => {
    const code = newCode()
    const fallback = exactFallback(exact)
    const names = declareQuantities(code, scenario, offsets)
    code.line('return (s) => {')
    code.line(names.forget)
    const { value, error } = emit(code, names, expression)
    code.line(`R.value = ${value}; R.error = ${error};`)
    code.line('};')
    const result = { value: 0, error: 0 }
    const run = build(code, fallback, { R: result }) as (state: ArrayLike<number>) => void
    const at = (state: ArrayLike<number>): void => {
      try {
        run(state)
      } catch (fault) {
        throw fault instanceof StateFault ? inMeasure(scenario, key, fault, describe(state)) : fault
      }
    }
    return {
      valueOf: (state) => {
        at(state)
        return result.value
      },
      errorOf: (state) => {
        at(state)
        return result.error
      },
      exactOf: (state) => exact(expression, state),
    }
  }
}

const inMeasure = (scenario: Scenario, key: string, fault: StateFault, state: string): StillmarkError => {
  const at = scenario.measures.find((measure) => key === `measures.${measure.name}`)?.at
  return new StillmarkError({
    code: fault.code,
    where: { file: scenario.source.file, line: at?.line, column: at?.column, key },
    what: `In the state ${state}: ${fault.message}`,
    next: fault.next,
  })
}

/** Whether something in the moves can't be followed in fractions. */
function mayBeIrrational(scenario: Scenario, body: VariablesBody): boolean {
  const text = JSON.stringify([body.transitions, [...scenario.quantities.values()]], (_, part) =>
    typeof part === 'bigint' ? `${part}` : part,
  )
  return /"name":"(?:exp|log|sqrt|poisson|poisson_tail)"|"op":"\^"/.test(text)
}
