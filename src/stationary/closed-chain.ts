import type { Chain, ClosedClass, JoinedArcs } from '../chain/chain.js'
import type { SparseRates } from '../chain/elimination-plan.js'

/** The chain of one closed class on its own: states numbered from 0 in the order of `states`. */
export interface ClosedChain extends SparseRates {
  readonly size: number
  /** Indices in the whole chain, ascending. */
  readonly states: Int32Array
  /** Bound on the error of each rate against the numbers as written. */
  readonly rateError: Float64Array
  /** size × width, row-major; empty where width is 0. */
  readonly values: Int32Array
  readonly width: number
}

/** Cuts a closed class out of its chain; staying is left out, since it changes nothing in the long run. */
export function closedChain(chain: Chain, joined: JoinedArcs, closed: ClosedClass): ClosedChain {
  const { states } = closed
  const size = states.length
  const indexOf = new Int32Array(chain.size).fill(-1)
  for (let k = 0; k < size; k++) indexOf[states[k]] = k
  const rowStart = new Int32Array(size + 1)
  let arcs = 0
  for (let k = 0; k < size; k++) {
    for (let arc = joined.rowStart[states[k]]; arc < joined.rowStart[states[k] + 1]; arc++) {
      if (joined.target[arc] !== states[k]) arcs++
    }
    rowStart[k + 1] = arcs
  }
  const target = new Int32Array(arcs)
  const rate = new Float64Array(arcs)
  const rateError = new Float64Array(arcs)
  const values = new Int32Array(size * chain.width)
  for (let k = 0, at = 0; k < size; k++) {
    const state = states[k]
    values.set(chain.values.subarray(state * chain.width, (state + 1) * chain.width), k * chain.width)
    for (let arc = joined.rowStart[state]; arc < joined.rowStart[state + 1]; arc++) {
      if (joined.target[arc] === state) continue
      target[at] = indexOf[joined.target[arc]]
      rate[at] = joined.rate[arc]
      rateError[at++] = joined.rateError[arc]
    }
  }
  return { size, states, rowStart, target, rate, rateError, values, width: chain.width }
}
