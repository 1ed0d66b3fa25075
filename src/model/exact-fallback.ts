import { compare, type Fraction, floor, fraction, isInteger, negate, toNumber, zero } from '../numbers/fraction.js'
import { type ExactEnvironment, evaluateExactly, NoValue } from '../scenario/evaluate-exactly.js'
import type { Expression } from '../scenario/expression.js'
import type { Scenario, StateVariable } from '../scenario/scenario.js'
import {
  type BoundedNumber,
  binomial,
  binomialTail,
  geometric,
  geometricTail,
  poisson,
  poissonTail,
} from './probability-functions.js'

/** A state in which an expression has no value, or a wrong one: told by the caller with the place and the state. */
export class StateFault extends Error {
  readonly code: string
  readonly next: string
  constructor(code: string, what: string, next: string) {
    super(what)
    this.code = code
    this.next = next
  }
}

type State = ArrayLike<number>
/** Name, value, name, value, … of what `each` and folds bind. */
type Bound = readonly (string | number)[]

const u = 2 ** -53 * (1 + 2 ** -20)

/** Values of a scenario's expressions in exact fractions. */
export type ExactValue = (expression: Expression, state: State, bound?: Bound) => Fraction | undefined

/** @param offsets position of each variable's first element in a state */
export function exactValues(
  scenario: Scenario,
  offsets: ReadonlyMap<string, { readonly offset: number; readonly declared: StateVariable }>,
): ExactValue {
  return (expression, state, bound = []) => {
    const names = new Map<string, Fraction>()
    for (let i = 0; i < bound.length; i += 2) names.set(bound[i] as string, fraction(bound[i + 1] as number))
    const environment: ExactEnvironment = {
      constants: scenario.constants,
      quantities: scenario.quantities,
      bound: names,
      variable: (name, index) => {
        const known = offsets.get(name)
        if (known === undefined) return undefined
        const { offset, declared } = known
        if (index === undefined || declared.index === undefined) return fraction(state[offset])
        const { from, to } = declared.index
        if (index < from || index > to)
          throw new NoValue(`"${name}[${index}]" is not there.`, `"${name}" has elements ${from} to ${to}.`)
        return fraction(state[offset + index - from])
      },
    }
    return evaluateExactly(expression, environment)
  }
}

/**
 * What generated code calls where a double can't decide: each question is settled in exact fractions when the two sides
 * are nearer than their error bounds. Where an irrational function is in the way, the doubles decide: exact equality of
 * such a value with a written number is then taken as it comes out.
 */
export function exactFallback(exact: ExactValue) {
  const asFault = <T>(make: () => T): T => {
    try {
      return make()
    } catch (error) {
      if (error instanceof NoValue) throw new StateFault('no-value', error.message, error.next)
      throw error
    }
  }
  const of = (expression: Expression, state: State, bound: Bound) => asFault(() => exact(expression, state, bound))
  const H = {
    /** Bound on the error of the last value that a helper gave. */
    error: 0,
    order(
      a: number,
      ea: number,
      b: number,
      eb: number,
      comparison: Extract<Expression, { kind: 'compare' }>,
      state: State,
      bound: Bound,
    ): number {
      const difference = a - b
      if (Math.abs(difference) > (ea + eb) * (1 + 2 ** -30) + Math.abs(difference) * u) return difference
      const left = of(comparison.left, state, bound)
      const right = of(comparison.right, state, bound)
      if (left === undefined || right === undefined) {
        if (Number.isNaN(difference))
          throw new StateFault(
            'no-value',
            'A comparison with something that has no value.',
            'Guard it with "and" or if(…).',
          )
        return difference
      }
      return compare(left, right)
    },
    floor(
      a: number,
      ea: number,
      expression: Extract<Expression, { kind: 'call' }>,
      state: State,
      bound: Bound,
    ): number {
      const low = Math.floor(a - ea)
      if (low === Math.floor(a + ea) && Number.isFinite(low)) return low
      const value = of(expression.args[0], state, bound)
      return value === undefined ? finite(Math.floor(a)) : Number(floor(value))
    },
    ceil(a: number, ea: number, expression: Extract<Expression, { kind: 'call' }>, state: State, bound: Bound): number {
      const low = Math.ceil(a - ea)
      if (low === Math.ceil(a + ea) && Number.isFinite(low)) return low
      const value = of(expression.args[0], state, bound)
      return value === undefined ? finite(Math.ceil(a)) : -Number(floor(negate(value)))
    },
    whole(a: number, ea: number, expression: Expression, state: State, bound: Bound): number {
      const near = Math.round(a)
      if (ea === 0 && near === a) return a
      const value = of(expression, state, bound)
      if (value !== undefined && isInteger(value)) return Number(value.numerator)
      if (value === undefined && Math.abs(near - a) <= ea && ea < 0.1) return near
      throw new StateFault('not-whole', `${a} is no whole number, and one is needed here.`, 'Use floor or ceil.')
    },
    remainder(
      a: number,
      ea: number,
      b: number,
      eb: number,
      expression: Expression,
      state: State,
      bound: Bound,
    ): number {
      if (b === 0) H.noValue('A remainder by 0.')
      if (ea === 0 && eb === 0 && Number.isSafeInteger(a) && Number.isSafeInteger(b)) {
        const rest = a % b
        H.error = 0
        return rest !== 0 && rest < 0 !== b < 0 ? rest + b : rest === 0 ? 0 : rest
      }
      const value = of(expression, state, bound)
      if (value !== undefined) return H.known(value)
      const times = Math.floor(a / b)
      const rest = a - b * times
      H.error = ea + Math.abs(times) * eb + 3 * u * (Math.abs(a) + Math.abs(b * times))
      return rest
    },
    power(a: number, ea: number, b: number, eb: number, expression: Expression, state: State, bound: Bound): number {
      if (a === 0 && b < 0) H.noValue('0 to a negative power.')
      if (a < 0 && !Number.isInteger(b)) H.noValue('A negative number to a power that is not whole.')
      if (ea === 0 && eb === 0 && Number.isInteger(b) && Math.abs(b) <= 64) {
        const value = wholePower(a, Math.abs(b))
        // Exact as long as the product of whole numbers fits.
        const exactly = Number.isInteger(a) && Math.abs(value) <= 2 ** 53 && b >= 0
        H.error = exactly ? 0 : Math.abs(b < 0 ? 1 / value : value) * (Math.abs(b) + 2) * u
        return b < 0 ? 1 / value : value
      }
      const value = ea === 0 && eb === 0 ? undefined : of(expression, state, bound)
      if (value !== undefined) return H.known(value)
      const power = a ** b
      const near = Math.abs(a) - ea
      const relative =
        a === 0 && ea === 0 ? 0 : (Math.abs(b) * ea) / Math.max(near, 0) + Math.abs(Math.log(Math.abs(a))) * eb
      H.error = a === 0 && ea === 0 ? 0 : Math.abs(power) * (Math.expm1(relative * (1 + relative)) + 4 * u)
      return power
    },
    /** An exact value as the nearest double. */
    known(value: Fraction): number {
      const number = toNumber(value)
      H.error = Math.abs(number) * u
      return number
    },
    quotientError(ea: number, quotient: number, b: number, eb: number): number {
      const least = Math.abs(b) - eb
      if (!(least > 0)) return Number.POSITIVE_INFINITY
      return ((ea + Math.abs(quotient) * eb) / least) * (1 + 2 ** -40) + Math.abs(quotient) * u + 5e-324
    },
    // The bounds on exp, log and sqrt allow 2 ulps of the engine's library function (fdlibm states less than 1).
    exp(a: number, ea: number): number {
      const value = Math.exp(a)
      H.error = value * (Math.expm1(ea) + 4 * u) * (1 + 2 ** -40)
      return value
    },
    log(a: number, ea: number): number {
      if (a - ea <= 0 && !(a > 0 && ea === 0)) H.noValue('The logarithm of a number that is not positive.')
      const value = Math.log(a)
      H.error = (ea / (a - ea)) * (1 + 2 ** -40) + 4 * u * Math.abs(value)
      return value
    },
    sqrt(a: number, ea: number): number {
      if (a + ea < 0 || (a < 0 && ea === 0)) H.noValue('The root of a negative number.')
      const value = Math.sqrt(Math.max(a, 0))
      H.error = (ea === 0 ? 0 : a > ea ? ea / value : Math.sqrt(ea + Math.max(a, 0))) + u * value
      return value
    },
    poisson: (k: number, ek: number, m: number, em: number) => H.bounded(() => poisson(H.count(k, ek), m, em)),
    poisson_tail: (k: number, ek: number, m: number, em: number) => H.bounded(() => poissonTail(H.count(k, ek), m, em)),
    binomial: (k: number, ek: number, n: number, en: number, p: number, ep: number) =>
      H.bounded(() => binomial(H.count(k, ek), H.count(n, en), p, ep)),
    binomial_tail: (k: number, ek: number, n: number, en: number, p: number, ep: number) =>
      H.bounded(() => binomialTail(H.count(k, ek), H.count(n, en), p, ep)),
    geometric: (k: number, ek: number, p: number, ep: number) => H.bounded(() => geometric(H.count(k, ek), p, ep)),
    geometric_tail: (k: number, ek: number, p: number, ep: number) =>
      H.bounded(() => geometricTail(H.count(k, ek), p, ep)),
    bounded(make: () => BoundedNumber): number {
      const { value, error } = asFault(make)
      H.error = error
      return value
    },
    count(k: number, ek: number): number {
      const near = Math.round(k)
      if (Math.abs(near - k) <= ek + 1e-9 * (ek > 0 ? 1 : 0) && ek < 0.1) return near
      if (near === k) return k
      throw new StateFault(
        'not-whole',
        `${k} is no whole number, and probability functions count in whole numbers.`,
        'Use floor or ceil.',
      )
    },
    outside(target: { readonly name: string }, index: number, from: number, to: number): never {
      throw new StateFault(
        'index-outside',
        `"${target.name}[${index}]" is not there.`,
        `"${target.name}" has elements ${from} to ${to}: guard it with "when".`,
      )
    },
    noValue(what: string): never {
      throw new StateFault('no-value', what, 'Guard it with "when" or if(…).')
    },
    tooLarge(value: number): never {
      throw new StateFault(
        'too-large',
        `A whole number grows to ${value}, beyond what can be kept exactly.`,
        'Measure it in larger units.',
      )
    },
    /** Whether a rate within its error of 0 is 0; throws nothing. */
    isZero(a: number, ea: number, expression: Expression, state: State, bound: Bound): boolean {
      if (ea === 0) return a === 0
      const value = of(expression, state, bound)
      return value === undefined ? a === 0 : compare(value, zero) === 0
    },
  }
  return H
}

function finite(value: number): number {
  if (!Number.isFinite(value))
    throw new StateFault('no-value', 'A rounding of something that has no value.', 'Guard it with "when" or if(…).')
  return value
}

function wholePower(a: number, exponent: number): number {
  let value = 1
  for (let i = 0; i < exponent; i++) value *= a
  return value
}
