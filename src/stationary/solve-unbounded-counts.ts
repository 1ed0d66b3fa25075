import type { CompiledMeasure, Expression, Functional, StateValue, VariablesModel } from '../model/model.js'
import { occurring } from '../recurrence/dependence.js'
import type { ExactMeasure } from './exact-answer.js'
import type { BoundedValue } from './mean-value.js'
import type { IndependentCounts } from './product-form.js'
import { meanOver, type ValueShares, valueShares } from './product-form-mean.js'
import type { MeasureText } from './solve-unbounded-measures.js'
import { listedShare, ratioOf } from './solve-unbounded-measures.js'
import { boundedValue, termsOf } from './solve-unbounded-terms.js'

/** A measure of a model whose unbounded counts are independent in the long run. */
export function countsMeasure(
  model: VariablesModel,
  independent: IndependentCounts,
  measure: CompiledMeasure,
  text: MeasureText,
): ExactMeasure {
  const mean = (functional: Functional, expression: Expression | undefined): BoundedValue =>
    meanOf(model, independent, functional, expression, measure.name)
  switch (measure.kind) {
    case 'average':
    case 'share':
    case 'frequency':
      return mean(measure.of, text.of)
    case 'ratio':
      return ratioOf(mean(measure.top, text.top), mean(measure.bottom, text.bottom), measure.name)
    case 'quantile':
      return quantileOf(sharesOf(model, independent, measure.value, text.of, measure.name), measure.level)
    case 'distribution':
      return distributionOf(sharesOf(model, independent, measure.value, text.of, measure.name))
  }
}

function meanOf(
  model: VariablesModel,
  independent: IndependentCounts,
  functional: Functional,
  expression: Expression | undefined,
  measure: string,
): BoundedValue {
  let value = 0
  let errorBound = 0
  for (const term of termsOf(model, functional, expression, lowestState(independent), measure)) {
    const own = meanOver(independent, membersOf(independent, term.elements), term.of, term.growth, measure)
    const next = value + own.value
    errorBound += own.errorBound + 2 ** -53 * Math.abs(next)
    value = next
  }
  return { value, errorBound: errorBound * (1 + 2 ** -40) }
}

function lowestState({ base, counts }: IndependentCounts): Float64Array {
  const state = Float64Array.from(base)
  for (const { element, outward, shares } of counts) state[element] = outward * shares.first
  return state
}

const membersOf = ({ counts }: IndependentCounts, elements: ReadonlySet<number>): number[] =>
  counts.flatMap(({ element }, k) => (elements.has(element) ? [k] : []))

function sharesOf(
  model: VariablesModel,
  independent: IndependentCounts,
  value: StateValue,
  expression: Expression | undefined,
  measure: string,
): ValueShares {
  const elements = expression === undefined ? new Set<number>() : occurring(model, expression, new Map())
  return valueShares(independent, membersOf(independent, elements), boundedValue(value), measure)
}

function distributionOf({ values, shares, relativeError, beyond, valueError }: ValueShares): ExactMeasure {
  let largest = 0
  const points: (readonly [number, number])[] = []
  values.forEach((value, k) => {
    largest = Math.max(largest, shares[k])
    if (shares[k] >= listedShare) points.push([value, shares[k]])
  })
  return { points, errorBound: relativeError * largest + beyond + listedShare + valueError }
}

/** The smallest value v with share(≤ v) ≥ level; where the shares leave it open, the bound says how far it may be off. */
function quantileOf({ values, shares, relativeError, beyond, valueError }: ValueShares, level: number): ExactMeasure {
  let below = 0
  let surely = -1
  let perhaps = -1
  for (let k = 0; k < values.length && surely < 0; k++) {
    below += shares[k]
    const error = (relativeError + (k + 2) * 2 ** -53) * below + beyond + 2 ** -53
    if (perhaps < 0 && below + error >= level) perhaps = k
    if (below - error >= level) surely = k
  }
  if (surely < 0) surely = values.length - 1
  if (perhaps < 0) perhaps = surely
  return { value: values[perhaps], errorBound: values[surely] - values[perhaps] + valueError }
}
