import type { Chain } from '../../src/chain/chain.js'

/** A chain from a list of arcs (from, to, rate), for tests that need no scenario. */
export function chainOfArcs(
  time: 'continuous' | 'discrete',
  size: number,
  arcs: readonly (readonly [from: number, to: number, rate: number])[],
): Chain {
  const sorted = [...arcs].sort((a, b) => a[0] - b[0])
  const rowStart = new Int32Array(size + 1)
  for (const [from] of sorted) rowStart[from + 1]++
  for (let i = 0; i < size; i++) rowStart[i + 1] += rowStart[i]
  return {
    time,
    size,
    start: 0,
    width: 0,
    values: new Int32Array(0),
    elements: [],
    rowStart,
    target: Int32Array.from(sorted, ([, to]) => to),
    rate: Float64Array.from(sorted, ([, , rate]) => rate),
    rateError: new Float64Array(sorted.length),
    label: new Int32Array(sorted.length).fill(-1),
  }
}
