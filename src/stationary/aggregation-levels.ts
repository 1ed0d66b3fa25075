import type { SparseRates } from '../chain/elimination-plan.js'
import type { ClosedChain } from './closed-chain.js'

/** A chain and the coarser one of its aggregates, and so on; patterns are fixed, the coarser rates are refilled. */
export interface Level extends SparseRates {
  readonly size: number
  /** Arcs into each state: rows of arc numbers, with the states they come from. */
  readonly intoStart: Int32Array
  readonly intoArc: Int32Array
  readonly intoFrom: Int32Array
  /** Σ of rates out of each state. */
  readonly leaving: Float64Array
  /** Aggregate of each state, and the arc of the coarser level that each arc goes into, -1 inside an aggregate. */
  readonly coarser?: { readonly level: Level; readonly aggregateOf: Int32Array; readonly arcOf: Int32Array }
}

/** Levels of so few states are solved by elimination. */
const coarsest = 200

/** Where a level does not come down to this part of the finer one, coarsening has lost its grip and stops. */
const leastShrinking = 0.9

/**
 * Aggregates by halving the coordinates where the states have any, else by pairing each state with the one that it
 * exchanges most with.
 *
 * Source: Horton and Leutenegger 1994 (from memory).
 */
export function aggregationLevels(chain: ClosedChain): Level {
  return build(chain, chain.size, chain.width === 0 ? undefined : { values: chain.values, width: chain.width })
}

function build(rates: SparseRates, size: number, coordinates?: { values: Int32Array; width: number }): Level {
  const into = incoming(rates, size)
  const own = { ...rates, size, ...into, leaving: leavingOf(rates, size) }
  if (size <= coarsest) return own
  let halved = coordinates && halves(coordinates, size)
  if (halved === undefined || halved.count > leastShrinking * size) halved = pairs(own)
  if (halved.count > leastShrinking * size) return own
  const { aggregateOf, count } = halved
  const { coarse, arcOf } = coarsePattern(rates, size, aggregateOf, count)
  let reduced: { values: Int32Array; width: number } | undefined
  if (coordinates !== undefined) {
    const { values, width } = coordinates
    reduced = { values: new Int32Array(count * width), width }
    for (let i = 0; i < size; i++) {
      for (let k = 0; k < width; k++) reduced.values[aggregateOf[i] * width + k] = values[i * width + k] >> 1
    }
  }
  // The coarser pattern is built from the rates as they are; they are filled in anew in every cycle.
  return { ...own, coarser: { level: build(coarse, count, reduced), aggregateOf, arcOf } }
}

export function leavingOf({ rowStart, rate }: SparseRates, size: number): Float64Array {
  const leaving = new Float64Array(size)
  for (let i = 0; i < size; i++) for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) leaving[i] += rate[arc]
  return leaving
}

function incoming({ rowStart, target }: SparseRates, size: number) {
  const intoStart = new Int32Array(size + 1)
  for (const to of target) intoStart[to + 1]++
  for (let i = 0; i < size; i++) intoStart[i + 1] += intoStart[i]
  const next = intoStart.slice(0, size)
  const intoArc = new Int32Array(target.length)
  const intoFrom = new Int32Array(target.length)
  for (let i = 0; i < size; i++) {
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      const at = next[target[arc]]++
      intoArc[at] = arc
      intoFrom[at] = i
    }
  }
  return { intoStart, intoArc, intoFrom }
}

function halves({ values, width }: { values: Int32Array; width: number }, size: number) {
  const aggregateOf = new Int32Array(size)
  const known = new Map<string, number>()
  const key = new Array<number>(width)
  for (let i = 0; i < size; i++) {
    for (let k = 0; k < width; k++) key[k] = values[i * width + k] >> 1
    const name = key.join()
    let aggregate = known.get(name)
    if (aggregate === undefined) {
      aggregate = known.size
      known.set(name, aggregate)
    }
    aggregateOf[i] = aggregate
  }
  return { aggregateOf, count: known.size }
}

function pairs({ size, rowStart, target, rate, leaving, intoStart, intoArc, intoFrom }: Level) {
  const aggregateOf = new Int32Array(size).fill(-1)
  let count = 0
  for (let i = 0; i < size; i++) {
    if (aggregateOf[i] !== -1) continue
    let partner = -1
    let strongest = 0
    const consider = (j: number, strength: number) => {
      if (j !== i && aggregateOf[j] === -1 && strength > strongest) {
        partner = j
        strongest = strength
      }
    }
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) consider(target[arc], rate[arc] / leaving[i])
    for (let k = intoStart[i]; k < intoStart[i + 1]; k++) consider(intoFrom[k], rate[intoArc[k]] / leaving[intoFrom[k]])
    aggregateOf[i] = count
    if (partner >= 0) aggregateOf[partner] = count
    count++
  }
  return { aggregateOf, count }
}

function coarsePattern({ rowStart, target, rate }: SparseRates, size: number, aggregateOf: Int32Array, count: number) {
  // States by aggregate, so that each coarse row is gathered in one go.
  const first = new Int32Array(count + 1)
  for (const each of aggregateOf) first[each + 1]++
  for (let a = 0; a < count; a++) first[a + 1] += first[a]
  const members = new Int32Array(size)
  const next = first.slice(0, count)
  for (let i = 0; i < size; i++) members[next[aggregateOf[i]]++] = i
  const arcOf = new Int32Array(target.length).fill(-1)
  const coarseStart = new Int32Array(count + 1)
  const coarseTarget: number[] = []
  const coarseRate: number[] = []
  const arcTo = new Int32Array(count).fill(-1)
  for (let a = 0; a < count; a++) {
    const begin = coarseTarget.length
    for (let m = first[a]; m < first[a + 1]; m++) {
      for (let arc = rowStart[members[m]]; arc < rowStart[members[m] + 1]; arc++) {
        const to = aggregateOf[target[arc]]
        if (to === a) continue
        if (arcTo[to] < begin) {
          arcTo[to] = coarseTarget.length
          coarseTarget.push(to)
          coarseRate.push(0)
        }
        arcOf[arc] = arcTo[to]
        coarseRate[arcTo[to]] += rate[arc]
      }
    }
    coarseStart[a + 1] = coarseTarget.length
  }
  const coarse = { rowStart: coarseStart, target: Int32Array.from(coarseTarget), rate: Float64Array.from(coarseRate) }
  return { coarse, arcOf }
}
