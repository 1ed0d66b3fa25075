import { add, divide, type Fraction, fraction, multiply, negate, one, toNumber, zero } from '../numbers/fraction.js'
import { evaluateExactly } from '../scenario/evaluate-exactly.js'
import type { Expression } from '../scenario/expression.js'
import { mentionsTransition } from '../scenario/firings.js'
import type { Scenario } from '../scenario/scenario.js'
import type { Label } from './model.js'

/**
 * What one firing of each label counts in an expression over transitions, which the scenario's checks have found to be
 * linear: its coefficients.
 * @returns length `labels`
 */
export function firingWeights(scenario: Scenario, expression: Expression, labels: readonly Label[]): Float64Array {
  const weights: Fraction[] = labels.map(() => zero)
  const constant = (part: Expression, bound: ReadonlyMap<string, Fraction>): Fraction =>
    evaluateExactly(part, { constants: scenario.constants, quantities: new Map(), variable: () => undefined, bound }) ??
    irrationalFactor(scenario, part, bound)
  const spread = (part: Expression, factor: Fraction, bound: ReadonlyMap<string, Fraction>): void => {
    switch (part.kind) {
      case 'transition': {
        const copy = part.copy?.map((index) => toNumber(constant(index, bound)))
        labels.forEach((label, i) => {
          const meant =
            label.transition === part.name && (copy === undefined || copy.every((value, k) => value === label.copy[k]))
          if (meant) weights[i] = add(weights[i], factor)
        })
        return
      }
      case 'negate':
        spread(part.of, negate(factor), bound)
        return
      case 'arithmetic': {
        const { op, left, right } = part
        if (op === '+' || op === '-') {
          spread(left, factor, bound)
          spread(right, op === '+' ? factor : negate(factor), bound)
        } else if (op === '/') spread(left, divide(factor, constant(right, bound)), bound)
        else if (mentionsTransition(left)) spread(left, multiply(factor, constant(right, bound)), bound)
        else spread(right, multiply(factor, constant(left, bound)), bound)
        return
      }
      case 'fold': {
        const from = toNumber(constant(part.from, bound))
        const to = toNumber(constant(part.to, bound))
        for (let i = from; i <= to; i++) spread(part.of, factor, new Map(bound).set(part.bound, fraction(i)))
        return
      }
      default:
        throw new Error(`a ${part.kind} is not linear in firings`)
    }
  }
  spread(expression, one, new Map())
  return Float64Array.from(weights, toNumber)
}

/** A factor such as exp(1): as the nearest number with 15 digits, which is what a double holds of it. */
function irrationalFactor(scenario: Scenario, part: Expression, bound: ReadonlyMap<string, Fraction>): Fraction {
  if (part.kind !== 'call' || part.args.length !== 1) throw new Error('a factor without an exact value')
  const value = evaluateExactly(part.args[0], {
    constants: scenario.constants,
    quantities: new Map(),
    variable: () => undefined,
    bound,
  })
  if (value === undefined) throw new Error('a factor without an exact value')
  const x = toNumber(value)
  const result = part.name === 'exp' ? Math.exp(x) : part.name === 'log' ? Math.log(x) : Math.sqrt(x)
  return fraction(BigInt(Math.round(result * 1e15)), 10n ** 15n)
}
