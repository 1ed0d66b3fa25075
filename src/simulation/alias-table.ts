import type { Chain } from '../chain/chain.js'

/**
 * How each state chooses among its arcs in one comparison, whatever their number. Slot k of a state is its k-th arc;
 * a place in the slot below `cutoff` means that arc, one above it the arc `alias` (an index over all arcs).
 */
export interface AliasTables {
  /** Length arcs, in [0, 1]. */
  readonly cutoff: Float64Array
  /** Length arcs. */
  readonly alias: Int32Array
  /** One over the total rate of each state, Infinity where nothing leaves; length n. */
  readonly meanHolding: Float64Array
}

/**
 * Source: Walker 1977; built in linear time as by Vose 1991.
 *
 * The probability of an arc below the mean of its row is kept to 2 ulp, that of any other to about twice the number of
 * arcs of the row in ulp: what rounding leaves over always lands on arcs that fill a slot almost alone.
 */
export function aliasTables(chain: Pick<Chain, 'size' | 'rowStart' | 'rate'>): AliasTables {
  const { size, rowStart, rate } = chain
  const arcs = rowStart[size]
  const cutoff = new Float64Array(arcs)
  const alias = new Int32Array(arcs)
  const meanHolding = new Float64Array(size)
  let longest = 0
  for (let i = 0; i < size; i++) longest = Math.max(longest, rowStart[i + 1] - rowStart[i])
  const below = new Int32Array(longest)
  const above = new Int32Array(longest)
  for (let i = 0; i < size; i++) {
    const first = rowStart[i]
    const end = rowStart[i + 1]
    let total = 0
    let lost = 0
    for (let arc = first; arc < end; arc++) {
      const sum = total + rate[arc]
      lost += total >= rate[arc] ? total - sum + rate[arc] : rate[arc] - sum + total
      total = sum
    }
    total += lost
    meanHolding[i] = 1 / total
    const degree = end - first
    let belowCount = 0
    let aboveCount = 0
    for (let arc = first; arc < end; arc++) {
      cutoff[arc] = (rate[arc] / total) * degree
      alias[arc] = arc
      if (cutoff[arc] < 1) below[belowCount++] = arc
      else above[aboveCount++] = arc
    }
    while (belowCount > 0 && aboveCount > 0) {
      const small = below[--belowCount]
      const large = above[aboveCount - 1]
      alias[small] = large
      // In this order nothing is lost: the sum is near 1 or above, the difference then exact or nearly so.
      cutoff[large] = cutoff[large] + cutoff[small] - 1
      if (cutoff[large] < 1) {
        aboveCount--
        below[belowCount++] = large
      }
    }
    // Only rounding keeps these from 1.
    while (belowCount > 0) cutoff[below[--belowCount]] = 1
    while (aboveCount > 0) cutoff[above[--aboveCount]] = 1
  }
  return { cutoff, alias, meanHolding }
}

/** Probability with which the tables choose each arc; length arcs. For checks. */
export function lawOf({ cutoff, alias }: AliasTables, { size, rowStart }: Pick<Chain, 'size' | 'rowStart'>) {
  const law = new Float64Array(cutoff.length)
  for (let i = 0; i < size; i++) {
    const degree = rowStart[i + 1] - rowStart[i]
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      law[arc] += cutoff[arc] / degree
      law[alias[arc]] += (1 - cutoff[arc]) / degree
    }
  }
  return law
}
