import { newMoves } from '../model/compile.js'
import type { Expression, Functional, StateValue, VariablesModel } from '../model/model.js'
import { type Fraction, fraction } from '../numbers/fraction.js'
import { occurring } from '../recurrence/dependence.js'
import type { BoundedFunction } from './product-form-mean.js'
import { type Growth, growthOf, plus, product } from './solve-unbounded-growth.js'

/** A part of a state function that depends on some elements only. */
export interface Term {
  /** Elements of the state on which it depends. */
  readonly elements: ReadonlySet<number>
  readonly of: BoundedFunction
  readonly growth: Growth
}

type Rule = Extract<VariablesModel['scenario']['body'], { kind: 'variables' }>['transitions'][number]

/**
 * A functional as a sum of terms, each of as few elements as its form shows.
 *
 * @param expression the text behind an average
 */
export function termsOf(
  model: VariablesModel,
  functional: Functional,
  expression: Expression | undefined,
  base: ArrayLike<number>,
  measure: string,
): Term[] {
  if (functional.kind === 'frequency') return firingTerms(model, functional.weights, measure)
  if (functional.kind === 'moves' || expression === undefined) throw new Error('a table is never unbounded')
  const groups = groupsOf(addends(model, expression).map((each) => occurring(model, each, new Map())))
  const growth = growthOf(model, expression, measure)
  const { value } = functional
  if (groups.length <= 1) return [{ elements: groups[0] ?? new Set(), of: boundedValue(value), growth }]
  // f = f(base) + Σ over groups of (f with the group's elements free - f(base)).
  const ground = boundedValue(value)(Float64Array.from(base))
  const constant: Term = { elements: new Set(), of: () => ground, growth }
  return [
    constant,
    ...groups.map((elements): Term => {
      const free = [...elements]
      const scratch = Float64Array.from(base)
      return {
        elements,
        growth: plus(growth, growth),
        of: (state) => {
          for (const element of free) scratch[element] = state[element]
          const own = boundedValue(value)(scratch)
          const difference = own.value - ground.value
          return {
            value: difference,
            errorBound: own.errorBound + ground.errorBound + 2 ** -53 * Math.abs(difference),
          }
        },
      }
    }),
  ]
}

export const boundedValue =
  (value: StateValue): BoundedFunction =>
  (state) => ({ value: value.valueOf(state), errorBound: value.errorOf(state) })

/** The growth of what a functional counts in a state. */
export function functionalGrowth(
  model: VariablesModel,
  functional: Functional,
  expression: Expression | undefined,
  measure: string,
): Growth {
  if (functional.kind !== 'frequency') return expression === undefined ? [0] : growthOf(model, expression, measure)
  return firingTerms(model, functional.weights, measure).reduce<Growth>((sum, { growth }) => plus(sum, growth), [0])
}

function firingTerms(model: VariablesModel, weights: Float64Array, measure: string): Term[] {
  const rules = new Map<string, Rule>()
  if (model.scenario.body.kind !== 'variables') return []
  for (const rule of model.scenario.body.transitions) rules.set(rule.name, rule)
  const labels = model.labels.flatMap((label, k) => {
    const rule = rules.get(label.transition)
    if (weights[k] === 0 || rule === undefined) return []
    const bound = new Map<string, Fraction>(rule.each.map(({ name }, i) => [name, fraction(label.copy[i])] as const))
    const elements = new Set([...occurring(model, rule.when, bound), ...occurring(model, rule.rate, bound)])
    const largest = label.copy.reduce((most, each) => Math.max(most, Math.abs(each)), 1)
    // What `each` binds is a number here; a growth takes it for at most s, which is true of s large enough.
    const growth = scaled(product(growthOf(model, rule.rate, measure), [Math.abs(weights[k])]), largest)
    return [{ k, elements, growth }]
  })
  const moves = newMoves(model.width)
  return groupsOf(labels.map(({ elements }) => elements)).map((elements, group) => {
    // Rates that depend on nothing go with the first group.
    const own = labels.filter((label) =>
      label.elements.size === 0 ? group === 0 : elements.has([...label.elements][0]),
    )
    const counted = new Float64Array(model.labels.length)
    for (const { k } of own) counted[k] = weights[k]
    return {
      elements,
      growth: own.reduce<Growth>((sum, { growth }) => plus(sum, growth), [0]),
      of: (state) => {
        model.expand(state, moves)
        let value = 0
        let size = 0
        let error = 0
        for (let move = 0; move < moves.count; move++) {
          const label = moves.label[move]
          if (label < 0 || counted[label] === 0) continue
          const part = counted[label] * moves.rate[move]
          value += part
          size += Math.abs(part)
          error += Math.abs(counted[label]) * moves.rateError[move]
        }
        return { value, errorBound: (error + moves.count * 2 ** -52 * size) * (1 + 2 ** -40) }
      },
    }
  })
}

/** P(s · factor), for what may be a constant of that size in place of s. */
const scaled = (growth: Growth, factor: number): Growth => growth.map((each, k) => each * factor ** k)

/** The parts of a sum; a constant factor stays with each. */
function addends(model: VariablesModel, node: Expression): Expression[] {
  const visit = (inner: Expression): Expression[] => addends(model, inner)
  switch (node.kind) {
    case 'quantity': {
      const quantity = model.scenario.quantities.get(node.name)
      return quantity === undefined ? [node] : visit(quantity)
    }
    case 'negate':
      return visit(node.of)
    case 'arithmetic':
      if (node.op === '+' || node.op === '-') return [...visit(node.left), ...visit(node.right)]
      if (node.op === '*' && isConstant(model, node.left)) return visit(node.right)
      if ((node.op === '*' || node.op === '/') && isConstant(model, node.right)) return visit(node.left)
      return [node]
    case 'fold':
      return node.fold === 'sum' ? unfolded(model, node) : [node]
    default:
      return [node]
  }
}

const isConstant = (model: VariablesModel, node: Expression): boolean => occurring(model, node, new Map()).size === 0

/** `sum(i, 1, 3, waiting[i])` as waiting[1], waiting[2], waiting[3]: only where the range is written in numbers or constants. */
function unfolded(model: VariablesModel, node: Extract<Expression, { kind: 'fold' }>): Expression[] {
  const from = wholeOf(model, node.from)
  const to = wholeOf(model, node.to)
  const { of } = node
  if (from === undefined || to === undefined || to - from > 1000 || of.kind !== 'variable') return [node]
  if (of.index?.kind !== 'bound' || of.index.name !== node.bound) return [node]
  return Array.from({ length: Math.max(0, to - from + 1) }, (_, k) => ({
    ...of,
    index: { kind: 'number', value: fraction(from + k) },
  }))
}

function wholeOf(model: VariablesModel, node: Expression): number | undefined {
  if (node.kind === 'number') return Number(node.value.numerator)
  if (node.kind !== 'constant') return undefined
  const value = model.scenario.constants.get(node.name)
  return value === undefined || !('numerator' in value) ? undefined : Number(value.numerator)
}

/** Sets that share an element joined; empty ones vanish where there are others. */
function groupsOf(sets: readonly ReadonlySet<number>[]): Set<number>[] {
  const groups: Set<number>[] = []
  for (const each of sets) {
    const joined = new Set(each)
    for (let k = groups.length - 1; k >= 0; k--) {
      if (![...groups[k]].some((element) => joined.has(element))) continue
      for (const element of groups[k]) joined.add(element)
      groups.splice(k, 1)
    }
    if (joined.size > 0) groups.push(joined)
  }
  return groups.length === 0 && sets.length > 0 ? [new Set()] : groups
}
