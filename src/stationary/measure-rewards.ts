import type { Chain } from '../chain/chain.js'
import type { Functional, Model } from '../model/model.js'
import { meanValue } from './mean-value.js'
import type { SolvedClass } from './solved-class.js'
import { stateFunction } from './state-functions.js'

/** A long-run mean as what it collects: by time in a state, and by firing. */
export interface Reward {
  /** Expected per time unit in each state of the class, length n of the class: firings by their rates included. */
  readonly perTime: Float64Array
  /** What one firing counts, by arc of the whole chain; undefined where nothing is counted. */
  readonly perFiring?: Float64Array
}

/**
 * The rewards behind the measures that are means or ratios of means, on one closed class. A ratio is made linear around
 * its exact value: (top - ratio · bottom) / mean of bottom, which has the ratio's variance and bias to first order
 * (delta method). Quantiles and distributions have none.
 */
export function measureRewards(model: Model, chain: Chain, solved: SolvedClass): Readonly<Record<string, Reward>> {
  const { states } = solved.chain
  const rewards: Record<string, Reward> = Object.create(null)
  const of = (functional: Functional, name: string): Reward => ({
    perTime: stateFunction(chain, states, functional, name).value,
    ...(functional.kind === 'average' ? {} : { perFiring: firingsOf(chain, functional) }),
  })
  for (const measure of model.measures) {
    if (measure.kind === 'quantile' || measure.kind === 'distribution') continue
    if (measure.kind !== 'ratio') {
      rewards[measure.name] = of(measure.of, measure.name)
      continue
    }
    const top = of(measure.top, measure.name)
    const bottom = of(measure.bottom, measure.name)
    const mean = ({ perTime }: Reward) =>
      meanValue(solved, { value: perTime, error: new Float64Array(perTime.length) }, false).value
    const below = mean(bottom)
    if (below === 0) continue
    const ratio = mean(top) / below
    const combined = (a: Float64Array | undefined, b: Float64Array | undefined, length: number) =>
      Float64Array.from({ length }, (_, i) => ((a?.[i] ?? 0) - ratio * (b?.[i] ?? 0)) / below)
    rewards[measure.name] = {
      perTime: combined(top.perTime, bottom.perTime, top.perTime.length),
      ...(top.perFiring === undefined && bottom.perFiring === undefined
        ? {}
        : { perFiring: combined(top.perFiring, bottom.perFiring, chain.target.length) }),
    }
  }
  return rewards
}

function firingsOf(chain: Chain, of: Exclude<Functional, { kind: 'average' }>): Float64Array {
  const { rowStart, target, label, size } = chain
  const counts = new Float64Array(target.length)
  for (let state = 0; state < size; state++) {
    for (let arc = rowStart[state]; arc < rowStart[state + 1]; arc++) {
      if (of.kind === 'frequency') counts[arc] = label[arc] < 0 ? 0 : of.weights[label[arc]]
      else if ((of.from ?? state) === state && (of.to ?? target[arc]) === target[arc]) counts[arc] = 1
    }
  }
  return counts
}
