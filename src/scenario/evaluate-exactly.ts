import {
  absolute, add, compare, divide, type Fraction, floor, fraction, isInteger, multiply, negate, one, power, sign, subtract,
  toNumber, zero,
} from '../numbers/fraction.js' // biome-ignore format: one list
import type { Expression } from './expression.js'

/** What names stand for. Each may answer undefined: not known exactly. */
export interface ExactEnvironment {
  readonly constants: ReadonlyMap<string, Fraction | readonly Fraction[]>
  readonly quantities: ReadonlyMap<string, Expression>
  /** Value of a state variable; `index` is undefined where it is no array. */
  readonly variable: (name: string, index: number | undefined) => Fraction | undefined
  readonly bound: ReadonlyMap<string, Fraction>
  /** Values of quantities in this state, filled as they are met: each is worked out once, however often it is named. */
  readonly known?: Map<string, Fraction | undefined>
  /** Work that is left for this value, in steps of about a tenth of a microsecond; counted down. */
  readonly work?: { left: number }
}

/** An expression that has no value: thrown by `evaluateExactly`, turned into a fault with its place by the caller. */
export class NoValue extends Error {
  readonly next: string
  constructor(what: string, next: string) {
    super(what)
    this.next = next
  }
}

/** Powers beyond this are not followed in fractions: the digits would fill the memory. */
const largestExponent = 4096
/** Numerators and denominators beyond this many bits are given up, as not exactly known. */
const mostBits = 40_000
const longest = 1n << BigInt(mostBits)
/** Work that one value may cost, under a second: folds within folds and fractions that grow would not end else. */
const mostWork = 1_000_000

/**
 * The exact value of an expression, conditions as 1 and 0.
 *
 * @returns undefined where the value is irrational, or too long or too much work to be followed in fractions
 * @throws NoValue: division by 0, an index outside its list, a logarithm of nothing and the like
 */
export function evaluateExactly(expression: Expression, given: ExactEnvironment): Fraction | undefined {
  const { known = new Map<string, Fraction | undefined>(), work = { left: mostWork } } = given
  const environment = given.known === known && given.work === work ? given : { ...given, known, work }
  if (work.left < 0) return undefined
  const value = evaluate(expression, environment)
  if (value === undefined || isLong(value)) return undefined
  work.left -= workOf(value)
  return value
}

/** A common divisor costs the square of the length. */
const workOf = (value: Fraction): number => {
  if (value.denominator < machineWord && value.numerator < machineWord && -value.numerator < machineWord) return 1
  const digits = Math.max(value.denominator.toString(16).length, value.numerator.toString(16).length)
  return 10 + (digits * digits) / 200
}
const machineWord = 1n << 64n

const isLong = (value: Fraction): boolean =>
  value.denominator > longest || value.numerator > longest || -value.numerator > longest

const truth = (value: boolean): Fraction => (value ? one : zero)

function evaluate(expression: Expression, environment: ExactEnvironment): Fraction | undefined {
  const of = (part: Expression) => evaluateExactly(part, environment)
  switch (expression.kind) {
    case 'number':
      return expression.value
    case 'truth':
      return truth(expression.value)
    case 'constant': {
      const value = environment.constants.get(expression.name)
      if (value === undefined) return undefined
      if (expression.index === undefined) return Array.isArray(value) ? undefined : (value as Fraction)
      const list = value as readonly Fraction[]
      const index = wholeIndex(of(expression.index), expression.name)
      if (index === undefined) return undefined
      if (index < 1 || index > list.length) {
        throw new NoValue(
          `"${expression.name}[${index}]" is not there.`,
          `"${expression.name}" has elements 1 to ${list.length}.`,
        )
      }
      return list[index - 1]
    }
    case 'variable': {
      if (expression.index === undefined) return environment.variable(expression.name, undefined)
      const index = wholeIndex(of(expression.index), expression.name)
      return index === undefined ? undefined : environment.variable(expression.name, index)
    }
    case 'quantity': {
      const { known } = environment
      if (known?.has(expression.name)) return known.get(expression.name)
      const quantity = environment.quantities.get(expression.name)
      const value = quantity === undefined ? undefined : of(quantity)
      known?.set(expression.name, value)
      return value
    }
    case 'bound':
      return environment.bound.get(expression.name)
    case 'transition':
      return undefined
    case 'negate': {
      const value = of(expression.of)
      return value && negate(value)
    }
    case 'not': {
      const value = of(expression.of)
      return value && truth(sign(value) === 0)
    }
    case 'arithmetic':
      return arithmetic(expression.op, of(expression.left), of(expression.right))
    case 'compare': {
      const left = of(expression.left)
      const right = of(expression.right)
      if (left === undefined || right === undefined) return undefined
      const order = compare(left, right)
      switch (expression.op) {
        case '<':
          return truth(order < 0)
        case '<=':
          return truth(order <= 0)
        case '>':
          return truth(order > 0)
        case '>=':
          return truth(order >= 0)
        case '==':
          return truth(order === 0)
        default:
          return truth(order !== 0)
      }
    }
    case 'logic': {
      const left = of(expression.left)
      if (left === undefined) return undefined
      const holds = sign(left) !== 0
      if (expression.op === 'and' ? !holds : holds) return truth(holds)
      const right = of(expression.right)
      return right && truth(sign(right) !== 0)
    }
    case 'if': {
      const condition = of(expression.condition)
      return condition && of(sign(condition) !== 0 ? expression.yes : expression.no)
    }
    case 'call':
      return called(expression.name, expression.args.map(of), environment.work)
    case 'fold': {
      const from = wholeIndex(of(expression.from), expression.bound)
      const to = wholeIndex(of(expression.to), expression.bound)
      if (from === undefined || to === undefined) return undefined
      if (to - from > 100_000)
        throw new NoValue(`The fold over "${expression.bound}" has over 100,000 terms.`, 'Make it shorter.')
      if (from > to && expression.fold !== 'sum') {
        throw new NoValue(
          `"${expression.fold}" over nothing has no value: "${expression.bound}" goes from ${from} to ${to}.`,
          'Make the range hold at least one value.',
        )
      }
      let result: Fraction | undefined = expression.fold === 'sum' ? zero : undefined
      for (let i = from; i <= to; i++) {
        const bound = new Map(environment.bound).set(expression.bound, fraction(i))
        const term = evaluateExactly(expression.of, { ...environment, bound })
        if (term === undefined) return undefined
        if (result === undefined) result = term
        else if (expression.fold === 'sum') result = add(result, term)
        else if (expression.fold === 'max_of') result = compare(term, result) > 0 ? term : result
        else result = compare(term, result) < 0 ? term : result
        if (isLong(result)) return undefined
        if (environment.work !== undefined) environment.work.left -= workOf(result)
      }
      return result
    }
  }
}

function wholeIndex(value: Fraction | undefined, name: string): number | undefined {
  if (value === undefined) return undefined
  if (!isInteger(value)) throw new NoValue(`An index of "${name}" is not a whole number.`, 'Use floor or ceil.')
  return Number(value.numerator)
}

function arithmetic(op: string, a: Fraction | undefined, b: Fraction | undefined): Fraction | undefined {
  if (a === undefined || b === undefined) return undefined
  switch (op) {
    case '+':
      return add(a, b)
    case '-':
      return subtract(a, b)
    case '*':
      return multiply(a, b)
    case '/':
      if (sign(b) === 0) throw new NoValue('A division by 0.', 'Guard it with "when" or if(…).')
      return divide(a, b)
    case '%':
      if (sign(b) === 0) throw new NoValue('A remainder by 0.', 'Guard it with "when" or if(…).')
      return subtract(a, multiply(b, fraction(floor(divide(a, b)))))
    default:
      return raised(a, b)
  }
}

function raised(a: Fraction, b: Fraction): Fraction | undefined {
  if (sign(a) === 0 && sign(b) < 0) throw new NoValue('0 to a negative power.', 'Guard it with "when" or if(…).')
  if (!isInteger(b)) {
    if (sign(a) < 0) throw new NoValue('A negative number to a power that is not whole.', 'Use abs, or a whole power.')
    if (sign(a) === 0) return zero
    return a.numerator === a.denominator ? one : undefined
  }
  if (a.numerator === a.denominator) return one
  const exponent = Number(b.numerator)
  if (Math.abs(exponent) > largestExponent) return undefined
  const bits = Math.max(a.numerator.toString(16).length, a.denominator.toString(16).length) * 4
  return bits * Math.abs(exponent) > mostBits ? undefined : power(a, exponent)
}

function called(
  name: string,
  args: readonly (Fraction | undefined)[],
  work: ExactEnvironment['work'],
): Fraction | undefined {
  if (args.some((value) => value === undefined)) return undefined
  const values = args as readonly Fraction[]
  const [a] = values
  switch (name) {
    case 'min':
      return values.reduce((least, value) => (compare(value, least) < 0 ? value : least))
    case 'max':
      return values.reduce((most, value) => (compare(value, most) > 0 ? value : most))
    case 'floor':
      return fraction(floor(a))
    case 'ceil':
      return fraction(-floor(negate(a)))
    case 'abs':
      return absolute(a)
    case 'exp':
      return sign(a) === 0 ? one : undefined
    case 'log':
      if (sign(a) <= 0) throw new NoValue('The logarithm of a number that is not positive.', 'Guard it with if(…).')
      return a.numerator === a.denominator ? zero : undefined
    case 'sqrt':
      if (sign(a) < 0) throw new NoValue('The root of a negative number.', 'Guard it with if(…), or use abs.')
      return squareRoot(a)
    case 'binomial':
    case 'binomial_tail':
      // A tail adds up to as many long terms as there are trials.
      if (work !== undefined && name === 'binomial_tail')
        work.left -= Math.min(toNumber(values[1]), mostTerms) ** 2 / 1.5
      return binomial(name === 'binomial_tail', values)
    case 'geometric':
    case 'geometric_tail':
      return geometric(name === 'geometric_tail', values)
    default:
      return poisson(name === 'poisson_tail', values)
  }
}

/** Exact where numerator and denominator are squares, else irrational. */
function squareRoot(a: Fraction): Fraction | undefined {
  const top = wholeRoot(a.numerator)
  const bottom = wholeRoot(a.denominator)
  return top === undefined || bottom === undefined ? undefined : fraction(top, bottom)
}

function wholeRoot(n: bigint): bigint | undefined {
  if (n < 2n) return n
  let root = 1n << BigInt(Math.ceil(n.toString(2).length / 2))
  for (let next = (root + n / root) / 2n; next < root; next = (root + n / root) / 2n) root = next
  return root * root === n ? root : undefined
}

const share = (p: Fraction, name: string): void => {
  if (sign(p) < 0 || compare(p, one) > 0)
    throw new NoValue(`"${name}" needs a probability from 0 to 1.`, 'Check its last argument.')
}
const whole = (k: Fraction, name: string): void => {
  if (!isInteger(k)) throw new NoValue(`"${name}" counts in whole numbers.`, 'Use floor or ceil on its first argument.')
}

/** Terms that are summed exactly at most. */
const mostTerms = 400

function binomial(tail: boolean, [k, n, p]: readonly Fraction[]): Fraction | undefined {
  const name = tail ? 'binomial_tail' : 'binomial'
  whole(k, name)
  if (!isInteger(n) || sign(n) < 0)
    throw new NoValue(`"${name}" needs a whole number of trials, 0 or more.`, 'Check its second argument.')
  share(p, name)
  if (compare(k, n) > 0) return zero
  if (tail && sign(k) <= 0) return one
  if (!tail && sign(k) < 0) return zero
  if (compare(n, fraction(mostTerms)) > 0) return undefined
  const trials = Number(n.numerator)
  const from = Number(k.numerator)
  const q = subtract(one, p)
  const term = (i: number): Fraction => {
    let ways = 1n
    for (let j = 1; j <= i; j++) ways = (ways * BigInt(trials - j + 1)) / BigInt(j)
    return multiply(fraction(ways), multiply(power0(p, i), power0(q, trials - i)))
  }
  let sum = term(from)
  if (tail) for (let i = from + 1; i <= trials; i++) sum = add(sum, term(i))
  return sum
}

const power0 = (a: Fraction, exponent: number): Fraction => (exponent === 0 ? one : power(a, exponent))

function geometric(tail: boolean, [k, p]: readonly Fraction[]): Fraction | undefined {
  const name = tail ? 'geometric_tail' : 'geometric'
  whole(k, name)
  share(p, name)
  if (sign(p) === 0) throw new NoValue(`"${name}" needs a probability above 0.`, 'Check its last argument.')
  if (sign(k) < 0) return tail ? one : zero
  if (compare(k, fraction(largestExponent)) > 0) return undefined
  const failures = power0(subtract(one, p), Number(k.numerator))
  return tail ? failures : multiply(failures, p)
}

function poisson(tail: boolean, [k, mean]: readonly Fraction[]): Fraction | undefined {
  const name = tail ? 'poisson_tail' : 'poisson'
  whole(k, name)
  if (sign(mean) < 0) throw new NoValue(`"${name}" needs a mean of 0 or more.`, 'Check its second argument.')
  if (sign(k) < 0) return tail ? one : zero
  if (tail && sign(k) === 0) return one
  if (sign(mean) === 0) return truth(!tail && sign(k) === 0)
  return undefined
}
