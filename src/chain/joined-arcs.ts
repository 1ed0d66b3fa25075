import { unitRoundoff } from '../numbers/double-double.js'
import type { Chain, JoinedArcs } from './chain.js'

/**
 * The distinct pairs (from, to) of a chain, sorted by `to` in each row, staying included: rates of parallel arcs are
 * added, their error bounds too, with what the additions may have rounded.
 *
 * @cost time and memory in proportion to the arcs
 */
export function joinArcs(chain: Chain): JoinedArcs {
  const { size, rowStart: from, target: firedTo, rate: fired, rateError: firedError } = chain
  // Two stable sorts by counting (by target, then by row) leave each row sorted by target, in linear time.
  const arcs = firedTo.length
  const byTarget = new Int32Array(arcs)
  const next = new Int32Array(size + 1)
  for (let arc = 0; arc < arcs; arc++) next[firedTo[arc] + 1]++
  for (let state = 0; state < size; state++) next[state + 1] += next[state]
  for (let arc = 0; arc < arcs; arc++) byTarget[next[firedTo[arc]]++] = arc
  const rowOf = new Int32Array(arcs)
  for (let state = 0; state < size; state++) rowOf.fill(state, from[state], from[state + 1])
  const sorted = new Int32Array(arcs)
  const place = from.slice()
  for (let k = 0; k < arcs; k++) sorted[place[rowOf[byTarget[k]]]++] = byTarget[k]

  const rowStart = new Int32Array(size + 1)
  const target = new Int32Array(arcs)
  const rate = new Float64Array(arcs)
  const rateError = new Float64Array(arcs)
  let count = 0
  for (let state = 0; state < size; state++) {
    let last = -1
    for (let k = from[state]; k < from[state + 1]; k++) {
      const arc = sorted[k]
      if (firedTo[arc] === last) {
        rate[count - 1] += fired[arc]
        rateError[count - 1] =
          (rateError[count - 1] + firedError[arc] + unitRoundoff * rate[count - 1]) * (1 + 2 ** -50)
      } else {
        last = firedTo[arc]
        target[count] = last
        rate[count] = fired[arc]
        rateError[count++] = firedError[arc]
      }
    }
    rowStart[state + 1] = count
  }
  return {
    rowStart,
    target: target.slice(0, count),
    rate: rate.slice(0, count),
    rateError: rateError.slice(0, count),
  }
}
