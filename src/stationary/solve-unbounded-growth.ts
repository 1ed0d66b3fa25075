import { StillmarkError } from '../errors/stillmark-error.js'
import type { Expression, VariablesModel } from '../model/model.js'
import { type Fraction, toNumber } from '../numbers/fraction.js'

/**
 * A polynomial P with coefficients of 0 or more, lowest power first: what it bounds is at most P(s) in every state whose
 * integers all lie within -s … s, for s ≥ 1.
 */
export type Growth = readonly number[]

/** Each rounding is covered by this factor; a growth takes fewer than 2¹² of them. */
const upwards = 1 + 2 ** -50

/**
 * How fast an expression can grow, from its form alone. What lies beyond the states that are added up is bounded with it.
 *
 * @throws growth-unknown (limit) where the form shows no polynomial bound: a state variable in an exponent, a logarithm
 */
export function growthOf(model: VariablesModel, expression: Expression, measure: string): Growth {
  const unknown = (what: string) =>
    new StillmarkError(
      {
        code: 'growth-unknown',
        where: { key: `measures.${measure}` },
        what: `No bound is known for ${what} far out, so the exact answer has no certified error.`,
        next: 'Write it with sums, products, powers, min, max and conditions, or give the variable an upper bound.',
      },
      'limit',
    )
  const visit = (node: Expression, bound: ReadonlyMap<string, Growth>): Growth => {
    const of = (inner: Expression): Growth => visit(inner, bound)
    switch (node.kind) {
      case 'number':
        return [magnitude(node.value)]
      case 'truth':
      case 'compare':
      case 'logic':
      case 'not':
        return [1]
      case 'constant': {
        const value = model.scenario.constants.get(node.name)
        if (value === undefined) throw unknown(`"${node.name}"`)
        return [isList(value) ? Math.max(0, ...value.map(magnitude)) : magnitude(value)]
      }
      case 'variable':
        return [0, 1]
      case 'quantity': {
        const quantity = model.scenario.quantities.get(node.name)
        if (quantity === undefined) throw unknown(`"${node.name}"`)
        return visit(quantity, new Map())
      }
      case 'bound':
        return bound.get(node.name) ?? [0, 1]
      case 'transition':
        throw unknown('a frequency')
      case 'negate':
        return of(node.of)
      case 'if':
        return largest(of(node.yes), of(node.no))
      case 'fold': {
        const range = largest(of(node.from), of(node.to))
        const each = visit(node.of, new Map([...bound, [node.bound, range]]))
        return node.fold === 'sum' ? product(each, plus(plus(range, range), [1])) : each
      }
      case 'arithmetic':
        switch (node.op) {
          case '+':
          case '-':
            return plus(of(node.left), of(node.right))
          case '*':
            return product(of(node.left), of(node.right))
          case '%':
            return of(node.right)
          case '/':
            return product(of(node.left), [inverse(node.right)])
          case '^': {
            const exponent = constantOf(model, node.right)
            const whole = exponent === undefined ? Number.NaN : toNumber(exponent)
            if (!Number.isInteger(whole) || whole < 0 || whole > 24) throw unknown('this power')
            let power: Growth = [1]
            for (let k = 0; k < whole; k++) power = product(power, of(node.left))
            return power
          }
        }
        throw unknown('this operation')
      case 'call':
        switch (node.name) {
          case 'min':
          case 'max':
            return node.args.map(of).reduce(largest)
          case 'floor':
          case 'ceil':
            return plus(of(node.args[0]), [1])
          case 'abs':
            return of(node.args[0])
          case 'sqrt':
            return plus(of(node.args[0]), [1])
          case 'poisson':
          case 'binomial':
          case 'geometric':
          case 'poisson_tail':
          case 'binomial_tail':
          case 'geometric_tail':
            return [1]
          default: {
            const argument = constantOf(model, node.args[0])
            if (argument === undefined) throw unknown(`"${node.name}"`)
            const at = toNumber(argument)
            return [Math.abs(node.name === 'exp' ? Math.exp(at) : Math.log(at)) * (1 + 2 ** -40) + 2 ** -1000]
          }
        }
    }
  }
  /** 1 over the smallest size of a denominator that is not 0: a multiple of 1/q is at least 1/q. */
  const inverse = (node: Expression): number => {
    const constant = constantOf(model, node)
    if (constant !== undefined) {
      const size = magnitude({
        numerator: constant.denominator,
        denominator: constant.numerator < 0n ? -constant.numerator : constant.numerator || 1n,
      })
      return size
    }
    const grid = gridOf(model, node)
    if (grid === undefined) throw unknown('this quotient')
    return magnitude({ numerator: grid, denominator: 1n })
  }
  return visit(expression, new Map())
}

/** P(s), rounded up. */
export function growthAt(growth: Growth, s: number): number {
  let value = 0
  for (let k = growth.length - 1; k >= 0; k--) value = (value * s + growth[k]) * upwards
  return value
}

export const plus = (a: Growth, b: Growth): Growth =>
  Array.from({ length: Math.max(a.length, b.length) }, (_, k) => ((a[k] ?? 0) + (b[k] ?? 0)) * upwards)

export const product = (a: Growth, b: Growth): Growth => {
  const result = new Array<number>(a.length + b.length - 1).fill(0)
  a.forEach((x, i) => {
    b.forEach((y, j) => {
      result[i + j] = (result[i + j] + x * y * upwards) * upwards
    })
  })
  return result
}

const largest = (a: Growth, b: Growth): Growth =>
  Array.from({ length: Math.max(a.length, b.length) }, (_, k) => Math.max(a[k] ?? 0, b[k] ?? 0))

const magnitude = (value: Fraction): number => Math.abs(toNumber(value)) * upwards

const isList = (value: Fraction | readonly Fraction[]): value is readonly Fraction[] => Array.isArray(value)

/** The value of a number or a constant, with a sign; undefined for anything else. */
function constantOf(model: VariablesModel, node: Expression): Fraction | undefined {
  if (node.kind === 'number') return node.value
  if (node.kind === 'negate') {
    const inner = constantOf(model, node.of)
    return inner === undefined ? undefined : { numerator: -inner.numerator, denominator: inner.denominator }
  }
  if (node.kind !== 'constant' || node.index !== undefined) return undefined
  const value = model.scenario.constants.get(node.name)
  return value === undefined || isList(value) ? undefined : value
}

/** q such that the value is a multiple of 1/q in every state; undefined where none is known. */
function gridOf(model: VariablesModel, node: Expression): bigint | undefined {
  const of = (inner: Expression): bigint | undefined => gridOf(model, inner)
  const joined = (grids: readonly (bigint | undefined)[]): bigint | undefined =>
    grids.reduce((a, b) => (a === undefined || b === undefined ? undefined : a * b), 1n)
  switch (node.kind) {
    case 'number':
      return node.value.denominator
    case 'truth':
    case 'compare':
    case 'logic':
    case 'not':
    case 'variable':
      return 1n
    case 'constant': {
      const value = model.scenario.constants.get(node.name)
      if (value === undefined) return undefined
      return isList(value) ? joined(value.map(({ denominator }) => denominator)) : value.denominator
    }
    case 'quantity': {
      const quantity = model.scenario.quantities.get(node.name)
      return quantity === undefined ? undefined : of(quantity)
    }
    case 'negate':
      return of(node.of)
    case 'if':
      return joined([of(node.yes), of(node.no)])
    case 'arithmetic':
      return node.op === '+' || node.op === '-' || node.op === '*' ? joined([of(node.left), of(node.right)]) : undefined
    case 'call':
      if (node.name === 'floor' || node.name === 'ceil') return 1n
      return node.name === 'min' || node.name === 'max' || node.name === 'abs' ? joined(node.args.map(of)) : undefined
    default:
      return undefined
  }
}
