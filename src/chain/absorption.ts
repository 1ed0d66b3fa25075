import { StillmarkError } from '../errors/stillmark-error.js'
import { unitRoundoff } from '../numbers/double-double.js'
import type { JoinedArcs } from './chain.js'
import { bearableOperations, planElimination } from './elimination-plan.js'
import { reduceStates, stationaryVector } from './state-reduction.js'

export interface Absorption {
  /** Probability of ending in each closed class from the start, length classes. */
  readonly reachedWith: Float64Array
  /** Bound on the error of each. */
  readonly reachedWithError: Float64Array
  /** Expected time from the start until a closed class is entered. */
  readonly meanTime: number
}

/**
 * Where a chain ends from its start, and when: the chain that goes back to the start as soon as it enters a closed
 * class spends time in each transient state, and enters each class, in the proportions asked for. So the same
 * subtraction-free elimination serves, and rare ways out keep their digits.
 *
 * @param classOf closed class of each state, -1 for transient ones
 * @param coordinates n × width, for the order of elimination
 * @throws settling-too-large (limit)
 */
export function absorptionFrom(
  start: number,
  arcs: JoinedArcs,
  classOf: Int32Array,
  classes: number,
  coordinates: { readonly values: Int32Array; readonly width: number },
): Absorption {
  const reachedWith = new Float64Array(classes)
  const reachedWithError = new Float64Array(classes)
  if (classOf[start] >= 0) {
    reachedWith[classOf[start]] = 1
    return { reachedWith, reachedWithError, meanTime: 0 }
  }
  const visited = transientFrom(start, arcs, classOf)
  const chain = returningChain(visited, arcs, classOf, coordinates)
  const plan = planElimination(chain.rates, chain.coordinates, 0)
  if (!(plan.operations <= bearableOperations && plan.bytes <= bearableBytes)) throw tooManyTransient(visited.length)
  const reduction = reduceStates(chain.rates, plan)
  const share = stationaryVector(reduction)
  let occupied = 0
  let entered = 0
  let inputError = 0
  for (let k = 0; k < visited.length; k++) {
    const state = visited[k]
    occupied += share[k]
    for (let arc = arcs.rowStart[state]; arc < arcs.rowStart[state + 1]; arc++) {
      inputError = Math.max(inputError, arcs.rateError[arc] / arcs.rate[arc])
      const ends = classOf[arcs.target[arc]]
      if (ends < 0) continue
      const flow = share[k] * arcs.rate[arc]
      reachedWith[ends] += flow
      entered += flow
    }
  }
  const n = visited.length
  // Rates off by a factor 1 ± η change a share by at most (1 ± η)^(2n) (see Reduction.relativeError); a flow once more.
  const relative = 2 * (reduction.relativeError + (2 * n + 1) * inputError + 2 * chain.rates.rate.length * unitRoundoff)
  for (let each = 0; each < classes; each++) {
    reachedWith[each] /= entered
    reachedWithError[each] = reachedWith[each] === 1 ? 0 : Math.min(1, relative * reachedWith[each])
  }
  return { reachedWith, reachedWithError, meanTime: occupied / entered }
}

/** What an elimination may take here. */
const bearableBytes = 4e9

const tooManyTransient = (states: number) =>
  new StillmarkError(
    {
      code: 'settling-too-large',
      what: `Where the model ends from its start hangs on ${states.toLocaleString('en-US')} states that it leaves for good, too closely knit to be followed exactly.`,
      next: 'Start the model in the part that it stays in, or make it smaller.',
    },
    'limit',
  )

/** Transient states that the start can reach, itself first. */
function transientFrom(start: number, { rowStart, target }: JoinedArcs, classOf: Int32Array): Int32Array {
  const seen = new Uint8Array(classOf.length)
  const queue = new Int32Array(classOf.length)
  let tail = 1
  queue[0] = start
  seen[start] = 1
  for (let k = 0; k < tail; k++) {
    for (let arc = rowStart[queue[k]]; arc < rowStart[queue[k] + 1]; arc++) {
      const head = target[arc]
      if (seen[head] === 1 || classOf[head] >= 0) continue
      seen[head] = 1
      queue[tail++] = head
    }
  }
  return queue.slice(0, tail)
}

/** The chain among `visited`, with every arc into a closed class led back to the first of them. */
function returningChain(
  visited: Int32Array,
  arcs: JoinedArcs,
  classOf: Int32Array,
  { values, width }: { readonly values: Int32Array; readonly width: number },
) {
  const indexOf = new Int32Array(classOf.length).fill(-1)
  for (let k = 0; k < visited.length; k++) indexOf[visited[k]] = k
  const rowStart = new Int32Array(visited.length + 1)
  for (let k = 0; k < visited.length; k++) {
    rowStart[k + 1] = rowStart[k] + arcs.rowStart[visited[k] + 1] - arcs.rowStart[visited[k]]
  }
  const target = new Int32Array(rowStart[visited.length])
  const rate = new Float64Array(target.length)
  const places = new Int32Array(visited.length * width)
  for (let k = 0, at = 0; k < visited.length; k++) {
    const state = visited[k]
    places.set(values.subarray(state * width, (state + 1) * width), k * width)
    for (let arc = arcs.rowStart[state]; arc < arcs.rowStart[state + 1]; arc++, at++) {
      target[at] = classOf[arcs.target[arc]] >= 0 ? 0 : indexOf[arcs.target[arc]]
      rate[at] = arcs.rate[arc]
    }
  }
  return { rates: { rowStart, target, rate }, coordinates: { values: places, width } }
}
