import type { Scenario, StateVariable, VariablesBody } from '../scenario/scenario.js'
import type { ExactValue } from './exact-fallback.js'
import { type Code, emit, type Names } from './generated-code.js'
import type { Label } from './model.js'

/** What the parts of compilation share. */
export interface Compilation {
  readonly scenario: Scenario
  readonly body: VariablesBody
  readonly offsets: ReadonlyMap<string, { readonly offset: number; readonly declared: StateVariable }>
  readonly elements: readonly string[]
  readonly lower: Float64Array
  readonly upper: Float64Array
  readonly labels: readonly Label[]
  readonly exact: ExactValue
  readonly describe: (state: ArrayLike<number>) => string
}

/** Makes a function of generated code; `H` are the helpers, `C` the objects it was handed, `N` an empty list. */
export function build(code: Code, fallback: unknown, extra: Readonly<Record<string, unknown>> = {}): unknown {
  const names = Object.keys(extra)
  return new Function('H', 'C', 'N', ...names, `'use strict';\n${code.text()}`)(
    fallback,
    code.constants,
    [],
    ...names.map((name) => extra[name]),
  )
}

/**
 * Quantities as functions that work once a state: however often and however deeply they are named, each is evaluated at
 * most once, and only where it is asked for.
 */
export function declareQuantities(
  code: Code,
  scenario: Scenario,
  variables: Compilation['offsets'],
): Names & { readonly forget: string } {
  const own = new Map([...scenario.quantities.keys()].map((name, i) => [name, i]))
  const quantities = new Map(
    [...own].map(([name, i]) => [name, { ensure: `Q${i}(s)`, value: `q${i}`, error: `d${i}` }]),
  )
  const names: Names = { constants: scenario.constants, variables, quantities, bound: new Map() }
  if (own.size > 0) code.line(`let ${[...own.values()].map((i) => `k${i} = false, q${i} = 0, d${i} = 0`).join(', ')};`)
  for (const [name, expression] of scenario.quantities) {
    const i = own.get(name)
    code.line(`function Q${i}(s) {`)
    code.line(`if (k${i}) return;`)
    const { value, error } = emit(code, names, expression)
    code.line(`q${i} = ${value}; d${i} = ${error}; k${i} = true;`)
    code.line('}')
  }
  return { ...names, forget: [...own.values()].map((i) => `k${i} = false;`).join(' ') }
}
