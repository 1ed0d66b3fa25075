import type { Chain } from '../chain/chain.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { Functional, StateValue } from '../model/model.js'
import type { StateFunction } from './mean-value.js'

/**
 * A functional as a function of the state, on some states of the chain: a value as it is, firings by their rate in
 * each state.
 *
 * @throws value-not-finite (input) where an expression has no finite value in some state
 */
export function stateFunction(chain: Chain, states: Int32Array, of: Functional, measure: string): StateFunction {
  if (of.kind === 'average') return valuesIn(chain, states, of.value, measure)
  const value = new Float64Array(states.length)
  const error = new Float64Array(states.length)
  for (let k = 0; k < states.length; k++) {
    const state = states[k]
    let sum = 0
    let bound = 0
    let magnitude = 0
    let terms = 0
    for (let arc = chain.rowStart[state]; arc < chain.rowStart[state + 1]; arc++) {
      const weight = weightOf(of, state, chain.target[arc], chain.label[arc])
      if (weight === 0) continue
      const term = weight * chain.rate[arc]
      sum += term
      magnitude += Math.abs(term)
      bound += Math.abs(weight) * chain.rateError[arc]
      if (weight !== 1) terms++
      terms++
    }
    value[k] = sum
    // A single firing of weight 1 is not rounded; else each product and each addition may be.
    error[k] = (bound + Math.max(0, terms - 1) * 2 ** -53 * magnitude) * (1 + 2 ** -40)
  }
  return { value, error }
}

function weightOf(of: Exclude<Functional, { kind: 'average' }>, from: number, to: number, label: number): number {
  if (of.kind === 'frequency') return label < 0 ? 0 : of.weights[label]
  return (of.from === undefined || of.from === from) && (of.to === undefined || of.to === to) ? 1 : 0
}

export function valuesIn(chain: Chain, states: Int32Array, of: StateValue, measure: string): StateFunction {
  const value = new Float64Array(states.length)
  const error = new Float64Array(states.length)
  const index = new Int32Array(1)
  for (let k = 0; k < states.length; k++) {
    const state = stateOf(chain, states[k], index)
    value[k] = of.valueOf(state)
    error[k] = of.errorOf(state)
    if (!Number.isFinite(value[k]) || !(error[k] < Number.POSITIVE_INFINITY)) throw notFinite(chain, states[k], measure)
  }
  return { value, error }
}

/** What a state's expressions are evaluated on: its integers, or a table's index. */
export function stateOf(chain: Chain, state: number, index: Int32Array): Int32Array {
  if (chain.names === undefined) return chain.values.subarray(state * chain.width, (state + 1) * chain.width)
  index[0] = state
  return index
}

function notFinite(chain: Chain, state: number, measure: string): StillmarkError {
  const values = chain.values.subarray(state * chain.width, (state + 1) * chain.width)
  const shown = chain.names?.[state] ?? chain.elements.map((name, k) => `${name} ${values[k]}`).join(', ')
  return new StillmarkError({
    code: 'value-not-finite',
    where: { key: `measures.${measure}` },
    what: `The measure "${measure}" has no finite value in the state ${shown}.`,
    next: 'Look for a division by 0, or the logarithm or root of a negative number.',
  })
}
