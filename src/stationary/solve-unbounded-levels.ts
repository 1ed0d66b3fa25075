import type { CompiledMeasure, Functional, VariablesModel } from '../model/model.js'
import type { TruncatedLevels } from './certified-truncation.js'
import type { ExactMeasure } from './exact-answer.js'
import { distributionOf, quantileOf } from './level-values.js'
import { type BoundedValue, meanValue } from './mean-value.js'
import type { Growth } from './solve-unbounded-growth.js'
import { listedShare, type MeasureText, ratioOf } from './solve-unbounded-measures.js'
import { functionalGrowth } from './solve-unbounded-terms.js'
import { stateFunction } from './state-functions.js'

/** A measure of a quasi-birth-death process whose lowest levels were solved. */
export function levelsMeasure(
  model: VariablesModel,
  kept: TruncatedLevels,
  measure: CompiledMeasure,
  text: MeasureText,
): ExactMeasure {
  const growthOf = (functional: Functional, side: keyof MeasureText) =>
    functionalGrowth(model, functional, text[side], measure.name)
  switch (measure.kind) {
    case 'average':
    case 'share':
    case 'frequency':
      return mean(kept, measure.of, growthOf(measure.of, 'of'), measure.name)
    case 'ratio':
      return ratioOf(
        mean(kept, measure.top, growthOf(measure.top, 'top'), measure.name),
        mean(kept, measure.bottom, growthOf(measure.bottom, 'bottom'), measure.name),
        measure.name,
      )
    case 'distribution': {
      const found = distributionOf(
        kept.chain,
        [{ solved: kept.solved, weight: 1, weightError: 0 }],
        measure.value,
        measure.name,
      )
      if (!('points' in found)) throw new Error('a distribution has points')
      return {
        points: found.points.filter(([, share]) => share >= listedShare),
        errorBound: found.errorBound + kept.changeOf(1) + kept.beyondOf([1]) + listedShare,
      }
    }
    case 'quantile':
      return quantile(model, kept, measure)
  }
}

function mean(
  { chain, solved, changeOf, beyondOf }: TruncatedLevels,
  of: Functional,
  growth: Growth,
  name: string,
): BoundedValue {
  const f = stateFunction(chain, solved.chain.states, of, name)
  const { value, errorBound } = meanValue(solved, f)
  const size = f.value.reduce((most, each, k) => Math.max(most, Math.abs(each) + f.error[k]), 0)
  return { value, errorBound: (errorBound + changeOf(size) + beyondOf(growth)) * (1 + 2 ** -40) }
}

/** Decided where the shares are further from the level than what was cut off can move them. */
function quantile(
  model: VariablesModel,
  kept: TruncatedLevels,
  { value: of, level, name }: Extract<CompiledMeasure, { kind: 'quantile' }>,
): ExactMeasure {
  const moved = Math.max(2 ** -52, kept.changeOf(1) + kept.beyondOf([1]))
  const at = (level: number): BoundedValue => {
    const found = quantileOf(model, kept.chain, [{ solved: kept.solved, weight: 1, weightError: 0 }], of, level, name)
    if (!('value' in found)) throw new Error('a quantile has a value')
    return found
  }
  const low = at(Math.max(0, level - moved))
  const high = at(Math.min(1, level + moved))
  const { value } = at(level)
  return {
    value,
    errorBound: Math.max(value - (low.value - low.errorBound), high.value + high.errorBound - value),
  }
}
