import type { Chain } from '../chain/chain.js'
import type { Model } from '../model/model.js'
import type { ExactArc } from './rational-solution.js'

/**
 * The arcs among some states of a chain in exact fractions, as the file's numbers give them; states numbered from 0 in
 * the order of `states`.
 *
 * @param states closed: no arc leaves them
 * @returns undefined where a rate is irrational or the model's moves leave the chain's states
 */
export function exactArcs(model: Model, chain: Chain, states: Int32Array): ExactArc[] | undefined {
  const arcs: ExactArc[] = []
  const indexOf = new Map<number | string, number>()
  if (model.kind === 'table') {
    for (let k = 0; k < states.length; k++) indexOf.set(states[k], k)
    for (const { from, to, value } of model.entries) {
      const source = indexOf.get(from)
      if (source === undefined) continue
      const head = indexOf.get(to)
      if (head === undefined) return undefined
      arcs.push({ from: source, to: head, rate: value })
    }
    return arcs
  }
  if (model.irrational) return undefined
  const valuesOf = (state: number) => chain.values.subarray(state * chain.width, (state + 1) * chain.width)
  for (let k = 0; k < states.length; k++) indexOf.set(valuesOf(states[k]).join(' '), k)
  for (let k = 0; k < states.length; k++) {
    for (const { rate, next } of model.expandExactly(valuesOf(states[k]))) {
      const head = indexOf.get(next.join(' '))
      if (rate === undefined || head === undefined) return undefined
      if (rate.numerator !== 0n) arcs.push({ from: k, to: head, rate })
    }
  }
  return arcs
}
