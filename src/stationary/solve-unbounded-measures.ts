import { StillmarkError } from '../errors/stillmark-error.js'
import type { Expression, VariablesModel } from '../model/model.js'
import type { BoundedValue } from './mean-value.js'

/** Smaller shares of a distribution are not listed. */
export const listedShare = 1e-18

/** The expressions behind a compiled measure, where they are averaged over time. */
export interface MeasureText {
  readonly of?: Expression
  readonly top?: Expression
  readonly bottom?: Expression
}

/** By the measure's place in the model. */
export function textOf(model: VariablesModel, index: number): MeasureText {
  const measure = model.scenario.measures[index]
  if (measure.kind === 'ratio') {
    return { top: expressionOf(measure.top.of), bottom: expressionOf(measure.bottom.of) }
  }
  return { of: expressionOf(measure.of) }
}

const expressionOf = (
  subject: { readonly kind: 'expression'; readonly of: Expression } | { readonly kind: 'states' | 'moves' },
): Expression | undefined => (subject.kind === 'expression' ? subject.of : undefined)

/** @throws ratio-of-nothing (input) where the lower side may be 0 */
export function ratioOf(top: BoundedValue, bottom: BoundedValue, measure: string): BoundedValue {
  const least = Math.abs(bottom.value) - bottom.errorBound
  if (!(least > 0)) {
    throw new StillmarkError({
      code: 'ratio-of-nothing',
      where: { key: `measures.${measure}` },
      what: `The ratio "${measure}" divides by something that is 0 in the long run.`,
      next: 'Put below the line what happens or is present in the long run.',
    })
  }
  const value = top.value / bottom.value
  const missed = top.errorBound + Math.abs(value) * bottom.errorBound
  return { value, errorBound: (missed / least + 2 ** -53 * Math.abs(value)) * (1 + 2 ** -40) }
}
