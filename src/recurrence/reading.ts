import { exactValues } from '../model/exact-fallback.js'
import type { VariablesModel } from '../model/model.js'
import { poisson, poissonTail } from '../model/probability-functions.js'
import {
  add,
  divide,
  type Fraction,
  floor,
  fraction,
  fractionOfDouble,
  isInteger,
  multiply,
  one,
  subtract,
  toNumber,
  zero,
} from '../numbers/fraction.js'
import { addPolynomials, coefficientsOf, constantPolynomial, degreeOf, polynomialOf, symbolsIn } from './polynomial.js'
import {
  addRationals,
  constantIn,
  divideRationals,
  expansionOf,
  multiplyRationals,
  NotFollowed,
  negateRational,
  orderOf,
  powerOfRational,
  type Rational,
  rationalOf,
  rationalSign,
  subtractRationals,
} from './rational.js'

export type Body = Extract<VariablesModel['scenario']['body'], { kind: 'variables' }>
export type Rule = Body['transitions'][number]
export type Expression = Rule['when']
type Kind<K extends Expression['kind']> = Extract<Expression, { kind: K }>

/** The body of a model by variables. */
export function bodyOf(model: VariablesModel): Body {
  const { body } = model.scenario
  if (body.kind !== 'variables') throw new NotFollowed('the model is a table')
  return body
}

/**
 * What an expression is read under: some elements of the state are large counts n₀, n₁, … (the symbols), all others
 * have values. `level` grows as comparisons are resolved: what was read holds wherever every count is at least that.
 */
export interface Reading {
  readonly model: VariablesModel
  readonly symbols: number
  /** Of each element of the state, length width. */
  readonly elements: readonly Rational[]
  readonly bound: ReadonlyMap<string, Fraction>
  /** Of a single count: it is `residue` modulo `modulus`. */
  readonly modulus: bigint
  readonly residue: bigint
  readonly reach: Reach
}

export interface Reach {
  level: number
  /** Some value has no exact fraction and was taken as the nearest double. */
  approximate: boolean
}

/** Thrown where an expression depends on the remainder of the count: read again with a multiple of `modulus`. */
export class NeedsModulus extends Error {
  constructor(readonly modulus: bigint) {
    super(`depends on the remainder modulo ${modulus}`)
  }
}

const truth = (value: boolean, symbols: number): Rational => rationalOf(value ? one : zero, symbols)

/**
 * The value of an expression far out, conditions as 1 and 0.
 * @throws NotFollowed, NeedsModulus
 */
export function read(expression: Expression, reading: Reading): Rational {
  const { symbols } = reading
  switch (expression.kind) {
    case 'number':
      return rationalOf(expression.value, symbols)
    case 'truth':
      return truth(expression.value, symbols)
    case 'constant':
      return rationalOf(constantValue(expression, reading), symbols)
    case 'variable':
      return reading.elements[elementOf(expression, reading)]
    case 'quantity': {
      const quantity = reading.model.scenario.quantities.get(expression.name)
      if (quantity === undefined) throw new NotFollowed(`"${expression.name}" is not known`)
      return read(quantity, { ...reading, bound: new Map() })
    }
    case 'bound': {
      const value = reading.bound.get(expression.name)
      if (value === undefined) throw new NotFollowed(`"${expression.name}" is not known`)
      return rationalOf(value, symbols)
    }
    case 'transition':
      throw new NotFollowed('a frequency stands in a rate')
    case 'negate':
      return negateRational(read(expression.of, reading))
    case 'not':
      return truth(!holds(read(expression.of, reading), reading), symbols)
    case 'arithmetic':
      return arithmetic(expression, reading)
    case 'compare': {
      const sign = signOf(subtractRationals(read(expression.left, reading), read(expression.right, reading)), reading)
      return truth(comparisons[expression.op](sign), symbols)
    }
    case 'logic': {
      const left = holds(read(expression.left, reading), reading)
      if (expression.op === 'and' ? !left : left) return truth(left, symbols)
      return truth(holds(read(expression.right, reading), reading), symbols)
    }
    case 'if':
      return read(holds(read(expression.condition, reading), reading) ? expression.yes : expression.no, reading)
    case 'call':
      return called(expression, reading)
    case 'fold':
      return folded(expression, reading)
  }
}

const comparisons: Record<Kind<'compare'>['op'], (sign: number) => boolean> = {
  '<': (sign) => sign < 0,
  '<=': (sign) => sign <= 0,
  '>': (sign) => sign > 0,
  '>=': (sign) => sign >= 0,
  '==': (sign) => sign === 0,
  '!=': (sign) => sign !== 0,
}

/** Whether a condition holds far out. */
export const holds = (value: Rational, reading: Reading): boolean => signOf(value, reading) !== 0

function signOf(value: Rational, reading: Reading): -1 | 0 | 1 {
  const found = rationalSign(value)
  if (found === undefined) throw new NotFollowed('a comparison of two unbounded variables is not settled far out')
  reading.reach.level = Math.max(reading.reach.level, found.level)
  return found.sign
}

/** A value that must not depend on any count. */
export function constantRead(expression: Expression, reading: Reading, what: string): Fraction {
  const value = constantIn(read(expression, reading))
  if (value === undefined) throw new NotFollowed(`${what} depends on an unbounded variable`)
  return value
}

function wholeRead(expression: Expression, reading: Reading, what: string): number {
  const value = constantRead(expression, reading, what)
  if (!isInteger(value)) throw new NotFollowed(`${what} is not a whole number`)
  return Number(value.numerator)
}

function constantValue(expression: Kind<'constant'>, reading: Reading): Fraction {
  const value = reading.model.scenario.constants.get(expression.name)
  if (value === undefined) throw new NotFollowed(`"${expression.name}" is not known`)
  if ('numerator' in value) return value
  if (expression.index === undefined) throw new NotFollowed(`"${expression.name}" is a list`)
  const element = value[wholeRead(expression.index, reading, 'an index') - 1]
  if (element === undefined) throw new NotFollowed(`an index of "${expression.name}" is outside the list`)
  return element
}

/** Position in the state of a variable, or of an element of an array. */
export function elementOf(target: { readonly name: string; readonly index?: Expression }, reading: Reading): number {
  let position = 0
  for (const variable of bodyOf(reading.model).variables) {
    const { index } = variable
    const count = index === undefined ? 1 : index.to - index.from + 1
    if (variable.name !== target.name) {
      position += count
      continue
    }
    if (index === undefined || target.index === undefined) return position
    const offset = wholeRead(target.index, reading, 'an index') - index.from
    if (offset < 0 || offset >= count) throw new NotFollowed(`an index of "${target.name}" is outside the array`)
    return position + offset
  }
  throw new NotFollowed(`"${target.name}" is not known`)
}

function arithmetic(expression: Kind<'arithmetic'>, reading: Reading): Rational {
  const left = read(expression.left, reading)
  const right = read(expression.right, reading)
  switch (expression.op) {
    case '+':
      return addRationals(left, right)
    case '-':
      return subtractRationals(left, right)
    case '*':
      return multiplyRationals(left, right)
    case '/':
      reachNonZero(right, reading)
      return divideRationals(left, right)
    case '^': {
      const exponent = constantIn(right)
      if (exponent === undefined) throw new NotFollowed('a power has an unbounded variable in its exponent')
      return powerOfRational(left, exponent, reading.symbols)
    }
    case '%': {
      // a - b·floor(a/b): the divisor's sign.
      const divisor = constantIn(right)
      if (divisor === undefined || divisor.numerator === 0n) {
        throw new NotFollowed('a remainder has an unbounded divisor or the divisor 0')
      }
      const whole = floorOf(divideRationals(left, right), reading)
      return subtractRationals(left, multiplyRationals(whole, right))
    }
  }
}

/** The quotient is as it was read only where its divisor is not 0. */
function reachNonZero(value: Rational, reading: Reading): void {
  if (constantIn(value) === undefined) signOf(value, reading)
}

function called(expression: Kind<'call'>, reading: Reading): Rational {
  const { symbols } = reading
  const args = expression.args.map((each) => read(each, reading))
  switch (expression.name) {
    case 'min':
    case 'max': {
      const direction = expression.name === 'min' ? 1 : -1
      return args.reduce((best, each) => (signOf(subtractRationals(each, best), reading) * direction < 0 ? each : best))
    }
    case 'abs':
      return signOf(args[0], reading) < 0 ? negateRational(args[0]) : args[0]
    case 'floor':
      return floorOf(args[0], reading)
    case 'ceil':
      return negateRational(floorOf(negateRational(args[0]), reading))
    default: {
      const constants = args.map(constantIn)
      if (constants.some((each) => each === undefined)) {
        throw new NotFollowed(`"${expression.name}" of an unbounded variable is not followed`)
      }
      return rationalOf(calledWith(expression.name, constants as readonly Fraction[], reading), symbols)
    }
  }
}

/** A function of constants: exact where it is rational, else the nearest double, and that is noted. */
function calledWith(name: Kind<'call'>['name'], args: readonly Fraction[], reading: Reading): Fraction {
  try {
    const call = { kind: 'call', name, args: args.map((value) => ({ kind: 'number', value }) as const) } as const
    const exact = exactValues(reading.model.scenario, new Map())(call, [])
    if (exact !== undefined) return exact
    const value = doubleOf(name, args.map(toNumber))
    if (value !== undefined && Number.isFinite(value)) {
      reading.reach.approximate = true
      return fractionOfDouble(value)
    }
  } catch (error) {
    // A function without a value there: the model itself says so where such a state is met.
    if (!(error instanceof Error)) throw error
  }
  throw new NotFollowed(`"${name}" has no value that can be followed`)
}

function doubleOf(name: Kind<'call'>['name'], [first, second]: readonly number[]): number | undefined {
  switch (name) {
    case 'exp':
      return Math.exp(first)
    case 'log':
      return Math.log(first)
    case 'sqrt':
      return Math.sqrt(first)
    case 'poisson':
      return poisson(first, second, 0).value
    case 'poisson_tail':
      return poissonTail(first, second, 0).value
    default:
      return undefined
  }
}

/**
 * floor of a rational function of one count: its polynomial part where that is whole, less 1 where the rest stays
 * below 0. A polynomial part with broken coefficients depends on the remainder of the count.
 */
function floorOf(value: Rational, reading: Reading): Rational {
  const { symbols } = reading
  const constant = constantIn(value)
  if (constant !== undefined) return rationalOf(fraction(floor(constant)), symbols)
  if (symbols !== 1) {
    if (![...symbolsIn(value.top), ...symbolsIn(value.bottom)].length)
      throw new NotFollowed('a rounding is not settled')
    throw new NotFollowed('an unbounded variable is rounded')
  }
  const order = orderOf(value)
  const polynomial = order < 0 ? [] : expansionOf(value, order, order + 1).reverse()
  const broken = polynomial.slice(1).filter((each) => !isInteger(each))
  let whole = polynomial
  if (broken.length > 0) {
    // n ≡ residue: a·n + b with a·modulus whole is a·(n - residue) + (a·residue + b).
    if (degreeOf(polynomialOf(polynomial)) > 1) throw new NotFollowed('a rounded expression is not linear')
    const slope = polynomial[1]
    if (!isInteger(multiply(slope, fraction(reading.modulus)))) throw new NeedsModulus(slope.denominator)
    const offset = multiply(slope, fraction(reading.residue))
    whole = [add(polynomial[0] ?? zero, offset), slope]
    return lowered(value, polynomial, whole, offset, reading)
  }
  return lowered(value, polynomial, whole, zero, reading)
}

/** `constants[0]` is the broken part's constant at the residue, `offset` what of it belongs to the linear part. */
function lowered(
  value: Rational,
  polynomial: readonly Fraction[],
  constants: readonly Fraction[],
  offset: Fraction,
  reading: Reading,
): Rational {
  const own = constants[0] ?? zero
  const rest = subtractRationals(value, { top: polynomialOf(polynomial), bottom: constantPolynomial(one, 1) })
  const below = fraction(floor(own))
  // own + rest lies in [below, below + 1) far out, but for a whole `own` with a rest below 0: then one less.
  const restSign = signOf(rest, reading)
  const floored = restSign < 0 && isInteger(own) ? subtract(below, one) : below
  const room = subtract(own, floored)
  // Far out |rest| is smaller than what is left to the next whole number on its side.
  const high = subtractRationals(rationalOf(subtract(one, room), 1), rest)
  const low = addRationals(rationalOf(room, 1), rest)
  if (signOf(high, reading) <= 0 || signOf(low, reading) < 0) throw new NotFollowed('a rounding is not settled')
  const linear = polynomialOf([zero, ...polynomial.slice(1)])
  const constant = constantPolynomial(subtract(floored, offset), 1)
  return { top: addPolynomials(linear, constant), bottom: constantPolynomial(one, 1) }
}

/** Terms of a fold that are followed. */
const mostTerms = 10_000

function folded(expression: Kind<'fold'>, reading: Reading): Rational {
  const from = wholeRead(expression.from, reading, 'the range of a fold')
  const to = wholeRead(expression.to, reading, 'the range of a fold')
  if (to - from > mostTerms) throw new NotFollowed('a fold has too many terms')
  let total: Rational | undefined = expression.fold === 'sum' ? rationalOf(zero, reading.symbols) : undefined
  for (let i = from; i <= to; i++) {
    const term = read(expression.of, { ...reading, bound: new Map(reading.bound).set(expression.bound, fraction(i)) })
    if (total === undefined) total = term
    else if (expression.fold === 'sum') total = addRationals(total, term)
    else {
      const direction = expression.fold === 'min_of' ? 1 : -1
      if (signOf(subtractRationals(term, total), reading) * direction < 0) total = term
    }
  }
  if (total === undefined) throw new NotFollowed('a fold has no terms')
  return total
}

/** Slope of a count in a value that is linear in it with a whole slope; undefined otherwise. */
export function wholeSlope(value: Rational): bigint | undefined {
  if (constantIn(value) !== undefined) return 0n
  const bottom = coefficientsOf(value.bottom)
  const top = coefficientsOf(value.top)
  if (bottom.length !== 1 || top.length > 2) return undefined
  const slope = divide(top[1] ?? zero, bottom[0])
  return isInteger(slope) ? slope.numerator : undefined
}
