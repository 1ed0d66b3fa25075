import { type Fraction, fraction, toNumber } from '../numbers/fraction.js'
import { evaluateExactly, NoValue } from '../scenario/evaluate-exactly.js'
import type { Expression } from '../scenario/expression.js'
import { partsOf } from '../scenario/firings.js'
import type { StateVariable } from '../scenario/scenario.js'

/**
 * JavaScript for expressions, each value with a running bound on its error against the exact value of the numbers as
 * written (running error analysis: Wilkinson 1986, Higham 2002 section 3.3, both from memory). What is generated
 * consists of fixed pieces, numbers and names of our own: no text of a scenario gets into it.
 */

/** A value in generated code: names or literals. */
export interface Emitted {
  readonly value: string
  /** Name of the bound, '0' where the value is exact. */
  readonly error: string
  /** The value is a whole number below 2^53 and exact. */
  readonly whole: boolean
}

/** What generated code is written into. */
export interface Code {
  line(text: string): void
  fresh(prefix: string): string
  /** Hands an object to the code at run time; @returns its name there. */
  constant(value: unknown): string
  readonly text: () => string
  readonly constants: readonly unknown[]
}

export function newCode(): Code {
  const lines: string[] = []
  const constants: unknown[] = []
  let names = 0
  return {
    line: (text) => void lines.push(text),
    fresh: (prefix) => `${prefix}${names++}`,
    constant(value) {
      const known = constants.indexOf(value)
      return `C[${known >= 0 ? known : constants.push(value) - 1}]`
    },
    text: () => lines.join('\n'),
    constants,
  }
}

/** What names mean in the code being written. */
export interface Names {
  readonly constants: ReadonlyMap<string, Fraction | readonly Fraction[]>
  /** Position of a variable's first element in the state, with its declaration. */
  readonly variables: ReadonlyMap<string, { readonly offset: number; readonly declared: StateVariable }>
  /** Call that makes sure a quantity is known in this state; its value and bound are then read from two names. */
  readonly quantities: ReadonlyMap<string, { readonly ensure: string; readonly value: string; readonly error: string }>
  /** Names of our own for the bound names. */
  readonly bound: ReadonlyMap<string, string>
}

/** Unit roundoff with a little room for the rounding of the bounds themselves. */
const u = '1.1102231e-16'

/** The nearest double, with half an ulp of error unless it is exact. */
export function literal(value: Fraction): Emitted {
  const number = toNumber(value)
  const exact = Number.isFinite(number) && sameAs(value, number)
  const text = Object.is(number, -0) ? '0' : number < 0 ? `(${number})` : `${number}`
  if (exact) return { value: text, error: '0', whole: Number.isSafeInteger(number) }
  return { value: text, error: `${Math.abs(number) * 1.1102231e-16 + 5e-324}`, whole: false }
}

function sameAs(value: Fraction, number: number): boolean {
  const { numerator, denominator } = value
  if (Number.isInteger(number)) return denominator === 1n && BigInt(number) === numerator
  // A double is a whole number over a power of two.
  let scale = 1n
  let scaled = number
  while (!Number.isInteger(scaled) && scale < 1n << 1100n) {
    scaled *= 2
    scale *= 2n
  }
  const exact = fraction(BigInt(scaled), scale)
  return exact.numerator === numerator && exact.denominator === denominator
}

/** Writes code that works an expression out; state is `s`. */
export function emit(code: Code, names: Names, expression: Expression): Emitted {
  const folded = foldedConstant(names, expression)
  if (folded !== undefined) return literal(folded)
  switch (expression.kind) {
    case 'number':
      return literal(expression.value)
    case 'truth':
      return { value: expression.value ? '1' : '0', error: '0', whole: true }
    case 'bound':
      return { value: names.bound.get(expression.name) as string, error: '0', whole: true }
    case 'constant':
      return emitConstant(code, names, expression)
    case 'variable':
      return { value: `s[${emitPosition(code, names, expression)}]`, error: '0', whole: true }
    case 'quantity': {
      const { ensure, value, error } = names.quantities.get(expression.name) as {
        ensure: string
        value: string
        error: string
      }
      code.line(`${ensure};`)
      const [v, e] = [code.fresh('v'), code.fresh('e')]
      code.line(`const ${v} = ${value}, ${e} = ${error};`)
      return { value: v, error: e, whole: false }
    }
    case 'negate': {
      const of = emit(code, names, expression.of)
      return { value: `(-${of.value})`, error: of.error, whole: of.whole }
    }
    case 'arithmetic':
      return emitArithmetic(code, names, expression)
    case 'call':
      return emitCall(code, names, expression)
    case 'fold':
      return emitFold(code, names, expression)
    case 'if':
      return emitIf(code, names, expression)
    case 'not':
    case 'compare':
    case 'logic':
      return { value: `(${emitCondition(code, names, expression)} ? 1 : 0)`, error: '0', whole: true }
    case 'transition':
      throw new Error('a frequency has no value in a state')
  }
}

/** Writes code that decides a condition; @returns the name of a boolean. */
export function emitCondition(code: Code, names: Names, expression: Expression): string {
  switch (expression.kind) {
    case 'truth':
      return String(expression.value)
    case 'not':
      return `!${emitCondition(code, names, expression.of)}`
    case 'logic': {
      const result = code.fresh('c')
      code.line(`let ${result} = ${emitCondition(code, names, expression.left)};`)
      code.line(`if (${expression.op === 'and' ? '' : '!'}${result}) {`)
      code.line(`${result} = ${emitCondition(code, names, expression.right)};`)
      code.line('}')
      return result
    }
    case 'compare': {
      const left = emit(code, names, expression.left)
      const right = emit(code, names, expression.right)
      const result = code.fresh('c')
      const op = expression.op === '==' ? '===' : expression.op === '!=' ? '!==' : expression.op
      if (left.error === '0' && right.error === '0') {
        code.line(`const ${result} = ${left.value} ${op} ${right.value};`)
      } else {
        const exact = code.constant(expression)
        code.line(
          `const ${result} = H.order(${left.value}, ${left.error}, ${right.value}, ${right.error}, ${exact}, s, ${boundList(code, names)}) ${op} 0;`,
        )
      }
      return result
    }
    default: {
      const value = emit(code, names, expression)
      if (value.error === '0') return `(${value.value} !== 0)`
      const result = code.fresh('c')
      const exact = code.constant({
        kind: 'compare',
        op: '!=',
        left: expression,
        right: { kind: 'number', value: fraction(0) },
      })
      code.line(
        `const ${result} = H.order(${value.value}, ${value.error}, 0, 0, ${exact}, s, ${boundList(code, names)}) !== 0;`,
      )
      return result
    }
  }
}

/** The bound names' values as an array of [name, value, …] for the exact way. */
const boundList = (code: Code, names: Names): string =>
  names.bound.size === 0
    ? 'N'
    : `[${[...names.bound].map(([name, own]) => `${code.constant(name)}, ${own}`).join(', ')}]`

/** Position in the state of a variable or of an element of an array. */
export function emitPosition(
  code: Code,
  names: Names,
  target: { readonly name: string; readonly index?: Expression },
): string {
  const { offset, declared } = names.variables.get(target.name) as { offset: number; declared: StateVariable }
  if (target.index === undefined || declared.index === undefined) return String(offset)
  const { from, to } = declared.index
  const index = emitWhole(code, names, target.index)
  if (/^\d+$/.test(index)) return String(offset + Number(index) - from)
  const position = code.fresh('p')
  code.line(
    `if (!(${index} >= ${from} && ${index} <= ${to})) H.outside(${code.constant(target)}, ${index}, ${from}, ${to}, s);`,
  )
  code.line(`const ${position} = ${offset - from} + ${index};`)
  return position
}

/** A value that must be a whole number: an index or the end of a range. */
export function emitWhole(code: Code, names: Names, expression: Expression): string {
  const value = emit(code, names, expression)
  if (value.whole) return value.value
  const whole = code.fresh('w')
  code.line(
    `const ${whole} = H.whole(${value.value}, ${value.error}, ${code.constant(expression)}, s, ${boundList(code, names)});`,
  )
  return whole
}

/** The exact value of an expression over constants alone, worked out once and for all. */
function foldedConstant(names: Names, expression: Expression): Fraction | undefined {
  if (expression.kind === 'number' || expression.kind === 'variable' || !overConstants(expression)) return undefined
  try {
    return evaluateExactly(expression, {
      constants: names.constants,
      quantities: new Map(),
      variable: () => undefined,
      bound: new Map(),
    })
  } catch (error) {
    // What has no value is told when it is met, if ever: a guard may keep it from being asked.
    if (error instanceof NoValue) return undefined
    throw error
  }
}

const constancy = new WeakMap<Expression, boolean>()

function overConstants(expression: Expression): boolean {
  const known = constancy.get(expression)
  if (known !== undefined) return known
  const found =
    !['variable', 'quantity', 'bound', 'transition', 'fold'].includes(expression.kind) &&
    partsOf(expression).every(overConstants)
  constancy.set(expression, found)
  return found
}

function emitConstant(code: Code, names: Names, expression: Extract<Expression, { kind: 'constant' }>): Emitted {
  const value = names.constants.get(expression.name)
  if (!Array.isArray(value)) return literal(value as Fraction)
  const list = value as readonly Fraction[]
  const literals = list.map(literal)
  const index = emitWhole(code, names, expression.index as Expression)
  if (/^\d+$/.test(index)) return literals[Number(index) - 1]
  const position = code.fresh('p')
  code.line(
    `if (!(${index} >= 1 && ${index} <= ${list.length})) H.outside(${code.constant(expression)}, ${index}, 1, ${list.length}, s);`,
  )
  code.line(`const ${position} = ${index} - 1;`)
  const numbers = code.constant(Float64Array.from(list, toNumber))
  const errors = literals.every((each) => each.error === '0')
    ? '0'
    : `${code.constant(Float64Array.from(literals, (each) => Number(each.error)))}[${position}]`
  return { value: `${numbers}[${position}]`, error: errors, whole: literals.every((each) => each.whole) }
}

function emitArithmetic(
  code: Code,
  names: Names,
  { op, left, right }: Extract<Expression, { kind: 'arithmetic' }>,
): Emitted {
  const a = named(code, emit(code, names, left))
  const b = named(code, emit(code, names, right))
  const [v, e] = [code.fresh('v'), code.fresh('e')]
  const result: Emitted = { value: v, error: e, whole: false }
  const whole = a.whole && b.whole
  switch (op) {
    case '+':
    case '-':
      code.line(`const ${v} = ${a.value} ${op} ${b.value};`)
      if (whole && !isSmall(a.value) && !isSmall(b.value)) code.line(watch(v))
      if (whole) return { value: v, error: '0', whole: true }
      code.line(`const ${e} = ${sumOf(a.error, b.error)} + Math.abs(${v}) * ${u};`)
      return result
    case '*':
      code.line(`const ${v} = ${a.value} * ${b.value};`)
      if (whole) code.line(watch(v))
      if (whole) return { value: v, error: '0', whole: true }
      code.line(
        `const ${e} = ${[
          b.error === '0' ? '' : `Math.abs(${a.value}) * ${b.error}`,
          a.error === '0' ? '' : `Math.abs(${b.value}) * ${a.error}`,
          a.error === '0' || b.error === '0' ? '' : `${a.error} * ${b.error}`,
          `Math.abs(${v}) * ${u}`,
        ].filter((term) => term !== '').join(' + ')} + (${v} === 0 ? 0 : 5e-324);`,
      ) // biome-ignore format: one term a line
      return result
    case '/':
      code.line(`const ${v} = ${a.value} / ${b.value};`)
      code.line(`if (${b.value} === 0) H.noValue('A division by 0.', s);`)
      if (a.error === '0' && b.error === '0')
        code.line(`const ${e} = Math.abs(${v}) * ${u} + (${v} === 0 ? 0 : 5e-324);`)
      else code.line(`const ${e} = H.quotientError(${a.error}, ${v}, ${b.value}, ${b.error});`)
      return result
    default: {
      const exact = code.constant({ kind: 'arithmetic', op, left, right })
      const helper = op === '%' ? 'remainder' : 'power'
      code.line(
        `const ${v} = H.${helper}(${a.value}, ${a.error}, ${b.value}, ${b.error}, ${exact}, s, ${boundList(code, names)});`,
      )
      code.line(`const ${e} = H.error;`)
      return result
    }
  }
}

/** Gives a value a name, so that it is worked out once. */
function named(code: Code, emitted: Emitted): Emitted {
  if (/^[\w.[\]]+$|^\(-?[\w.e+-]+\)$/.test(emitted.value)) return emitted
  const value = code.fresh('v')
  code.line(`const ${value} = ${emitted.value};`)
  return { ...emitted, value }
}

/** A part of the state or a plain number: beside it a watched whole number stays far from 2^53. */
const isSmall = (value: string): boolean => /^s\[\d+\]$|^\(?-?\d{1,9}\)?$/.test(value)

/** Whole numbers are exact up to 2^53; they are stopped at 2^52, so that a few more steps are safe. */
const watch = (value: string): string => `if (Math.abs(${value}) > 4503599627370496) H.tooLarge(${value}, s);`

const sumOf = (a: string, b: string): string => (a === '0' ? b : b === '0' ? a : `${a} + ${b}`)

function emitCall(code: Code, names: Names, expression: Extract<Expression, { kind: 'call' }>): Emitted {
  const args = expression.args.map((each) => named(code, emit(code, names, each)))
  const values = args.map((each) => each.value)
  const exact = args.every((each) => each.error === '0')
  const whole = args.every((each) => each.whole)
  const [v, e] = [code.fresh('v'), code.fresh('e')]
  switch (expression.name) {
    case 'min':
    case 'max':
      code.line(`const ${v} = Math.${expression.name}(${values.join(', ')});`)
      if (exact) return { value: v, error: '0', whole }
      code.line(`const ${e} = Math.max(${args.map((each) => each.error).join(', ')});`)
      return { value: v, error: e, whole: false }
    case 'abs':
      return { value: `Math.abs(${values[0]})`, error: args[0].error, whole }
    case 'floor':
    case 'ceil': {
      if (whole) return args[0]
      const tree = code.constant(expression)
      code.line(
        `const ${v} = H.${expression.name}(${values[0]}, ${args[0].error}, ${tree}, s, ${boundList(code, names)});`,
      )
      return { value: v, error: '0', whole: true }
    }
    default:
      code.line(`const ${v} = H.${expression.name}(${args.flatMap((each) => [each.value, each.error]).join(', ')}, s);`)
      code.line(`const ${e} = H.error;`)
      return { value: v, error: e, whole: false }
  }
}

function emitFold(code: Code, names: Names, expression: Extract<Expression, { kind: 'fold' }>): Emitted {
  const from = emitWhole(code, names, expression.from)
  const to = emitWhole(code, names, expression.to)
  const [v, e, own, some] = ['v', 'e', 'b', 'f'].map((prefix) => code.fresh(prefix))
  code.line(`let ${v} = 0, ${e} = 0, ${some} = false;`)
  code.line(`for (let ${own} = ${from}; ${own} <= ${to}; ${own}++) {`)
  const inner: Names = { ...names, bound: new Map(names.bound).set(expression.bound, own) }
  const term = named(code, emit(code, inner, expression.of))
  if (expression.fold === 'sum') {
    code.line(`${v} += ${term.value};`)
    if (term.whole) code.line(watch(v))
    else code.line(`${e} += ${term.error} + Math.abs(${v}) * ${u};`)
  } else {
    const better = expression.fold === 'max_of' ? '>' : '<'
    code.line(`if (!${some} || ${term.value} ${better} ${v}) ${v} = ${term.value};`)
    if (term.error !== '0') code.line(`if (${term.error} > ${e}) ${e} = ${term.error};`)
    code.line(`${some} = true;`)
  }
  code.line('}')
  if (expression.fold !== 'sum') code.line(`if (!${some}) H.noValue('A largest or smallest of nothing.', s);`)
  return {
    value: v,
    error: term.error === '0' && (term.whole || expression.fold !== 'sum') ? '0' : e,
    whole: term.whole,
  }
}

function emitIf(code: Code, names: Names, expression: Extract<Expression, { kind: 'if' }>): Emitted {
  const [v, e] = [code.fresh('v'), code.fresh('e')]
  const condition = emitCondition(code, names, expression.condition)
  code.line(`let ${v}, ${e} = 0;`)
  code.line(`if (${condition}) {`)
  const yes = emit(code, names, expression.yes)
  code.line(`${v} = ${yes.value}; ${e} = ${yes.error};`)
  code.line('} else {')
  const no = emit(code, names, expression.no)
  code.line(`${v} = ${no.value}; ${e} = ${no.error};`)
  code.line('}')
  const exact = yes.error === '0' && no.error === '0'
  return { value: v, error: exact ? '0' : e, whole: yes.whole && no.whole }
}
