import { StillmarkError } from '../errors/stillmark-error.js'
import { unitRoundoff } from '../numbers/double-double.js'
import { eliminateLeading } from './dense-elimination.js'
import type { EliminationPlan, SparseRates } from './elimination-plan.js'
import { simdProducts } from './simd-products.js'

/** A front that has been eliminated. */
interface Front {
  /** Number of states that went. */
  readonly pivots: number
  /** States of the front, those that went first, then those that were left. */
  readonly states: Int32Array
  /** pivots × size: row k holds the shares a_ik / s_k of pivot k, by i. */
  readonly shares: Float64Array
  /** pivots × size: row k holds the rates a_kj of pivot k, by j. */
  readonly rates: Float64Array
  /** Length pivots: s_k. */
  readonly leaving: Float64Array
}

/** An irreducible chain, reduced to one state; what back substitutions need. */
export interface Reduction {
  readonly size: number
  /** The state that was left. */
  readonly root: number
  readonly fronts: readonly Front[]
  /** The rates were taken times this power of two. */
  readonly scale: number
  /**
   * Bound on the relative error that rounding may have put into any entry of the stationary vector that lies within
   * 1e-140 of the largest: each step changes the rates out of the states of its front by a few roundings, and rates out
   * of f states off by a factor 1 ± η change every share by a factor within (1 ± η)^(2f) (O'Cinneide 1993, theorem 1,
   * from memory: it follows from the tree formula).
   */
  readonly relativeError: number
}

/** Smaller fronts are eliminated by the plain loop. */
const smallestForSimd = 64

/** States that are left with less than this part of the largest rate are kept back: below, shares would underflow. */
const leastLeaving = 1e-150

/**
 * Reduces an irreducible chain to a single state, front by front, by sums, products and quotients of non-negative
 * numbers only, so that the smallest share of time keeps its digits whatever the chain.
 *
 * Sources: Grassmann, Taksar and Heyman 1985 (elimination), O'Cinneide 1993 (accuracy), Duff and Reid 1983 (fronts).
 *
 * @param onFront called after each front with the part of the operations done, 0 to 1; may throw to end it
 * @throws range-exceeded (limit) where rates differ by so much that no order of elimination can be followed in doubles
 */
export function reduceStates(rates: SparseRates, plan: EliminationPlan, onFront?: (done: number) => void): Reduction {
  const { rowStart, target, rate } = rates
  const { order, pivotStart, parent, boundaryStart, boundary, fronts: count } = plan
  const n = order.length
  let largest = 0
  for (const each of rate) if (each > largest) largest = each
  const scale = 2 ** -Math.floor(Math.log2(largest || 1))
  const positionOf = new Int32Array(n)
  for (let k = 0; k < n; k++) positionOf[order[k]] = k
  const local = new Int32Array(n)
  // What arcs into a front's states: the transpose, so that a front finds the rates from its boundary.
  const incoming = transpose(rates)
  const simd = simdProducts()
  const updates: (Update[] | undefined)[] = new Array(count)
  const fronts: Front[] = []
  let operations = 0
  let error = 0
  let root = order[n - 1]
  for (let t = 0; t < count; t++) {
    const from = updates[t] ?? []
    updates[t] = undefined
    const kept = from.flatMap((update) => Array.from(update.kept))
    const own = pivotStart[t + 1] - pivotStart[t]
    const pivots = own + kept.length
    const size = pivots + boundaryStart[t + 1] - boundaryStart[t]
    const states = new Int32Array(size)
    for (let k = 0; k < own; k++) states[k] = order[pivotStart[t] + k]
    for (let k = 0; k < kept.length; k++) states[own + k] = kept[k]
    for (let k = pivots; k < size; k++) states[k] = order[boundary[boundaryStart[t] + k - pivots]]
    for (let k = 0; k < size; k++) local[states[k]] = k
    const a = size < smallestForSimd || simd === undefined ? new Float64Array(size * size) : simd.matrix(size * size)
    for (let k = 0; k < own; k++) {
      const state = states[k]
      for (let arc = rowStart[state]; arc < rowStart[state + 1]; arc++) {
        const to = target[arc]
        if (to !== state && positionOf[to] >= pivotStart[t]) a[k * size + local[to]] += rate[arc] * scale
      }
      for (let arc = incoming.start[state]; arc < incoming.start[state + 1]; arc++) {
        const source = incoming.from[arc]
        if (positionOf[source] >= pivotStart[t + 1]) a[local[source] * size + k] += incoming.rate[arc] * scale
      }
    }
    for (const update of from) addUpdate(a, size, update, local)

    const leaving = new Float64Array(pivots)
    const isLast = parent[t] < 0
    let done = eliminateLeading(a, size, pivots, states, leaving, leastLeaving, simd)
    if (isLast && done < size - 1) {
      // Nothing can be handed on: states that are all but cut off from one another go as long as a double can follow.
      const more = eliminateRest(a, size, done, states, leaving)
      done += more
      if (done < size - 1) throw rangeExceeded()
    }
    // Roundings a step puts into the rates out of each state: share, product, sum (5 with s_k), and one an update added.
    for (let k = 0; k < done; k++) error += 2 * (size - k) * (6 + (k === 0 ? from.length + 1 : 0)) * unitRoundoff
    fronts.push(factorsOf(a, size, done, states, leaving))
    if (isLast) root = states[size - 1]
    else {
      const left = size - done
      const matrix = new Float64Array(left * left)
      for (let i = 0; i < left; i++) matrix.set(a.subarray((done + i) * size + done, (done + i + 1) * size), i * left)
      const update = { states: states.slice(done), kept: states.slice(done, pivots), matrix }
      const waiting = updates[parent[t]]
      if (waiting === undefined) updates[parent[t]] = [update]
      else waiting.push(update)
    }
    operations += size * size * pivots
    onFront?.(Math.min(1, operations / (plan.operations + 1)))
  }
  let substitution = 0 // a share is a sum over its front: its own roundings, along the longest way, taken as all
  for (const front of fronts) substitution += front.pivots * 4 * unitRoundoff
  return { size: n, root, fronts, scale, relativeError: (error + 2 * substitution + 8 * unitRoundoff) * 1.01 }
}

/** Rates among the states that a front has left over. */
interface Update {
  readonly states: Int32Array
  /** Those of them that should have gone. */
  readonly kept: Int32Array
  readonly matrix: Float64Array
}

function addUpdate(a: Float64Array, size: number, { states, matrix }: Update, local: Int32Array): void {
  const count = states.length
  const place = Int32Array.from(states, (state) => local[state])
  for (let i = 0, k = 0; i < count; i++) {
    const row = place[i] * size
    for (let j = 0; j < count; j++, k++) a[row + place[j]] += matrix[k]
  }
}

/** Goes on with the states from `done` on, whatever their s_k is as long as it is not 0. @returns how many went */
function eliminateRest(a: Float64Array, size: number, done: number, states: Int32Array, leaving: Float64Array): number {
  const left = size - done
  const matrix = new Float64Array(left * left)
  for (let i = 0; i < left; i++) matrix.set(a.subarray((done + i) * size + done, (done + i + 1) * size), i * left)
  const names = states.slice(done)
  const before = Array.from(names)
  const out = new Float64Array(left)
  const went = eliminateLeading(matrix, left, left, names, out, Number.MIN_VALUE)
  // Columns and rows of earlier pivots follow the new order of the states.
  const whereWas = Array.from(names, (state) => before.indexOf(state))
  for (let k = 0; k < done; k++) {
    const row = Array.from(whereWas, (i) => a[k * size + done + i])
    const column = Array.from(whereWas, (i) => a[(done + i) * size + k])
    for (let i = 0; i < left; i++) {
      a[k * size + done + i] = row[i]
      a[(done + i) * size + k] = column[i]
    }
  }
  for (let i = 0; i < left; i++) a.set(matrix.subarray(i * left, (i + 1) * left), (done + i) * size + done)
  states.set(names, done)
  leaving.set(out.subarray(0, Math.min(left, leaving.length - done)), done)
  return went
}

function factorsOf(a: Float64Array, size: number, pivots: number, states: Int32Array, leaving: Float64Array): Front {
  const shares = new Float64Array(pivots * size)
  // Transposed in squares that stay in the fastest cache.
  for (let from = 0; from < size; from += 32) {
    const to = Math.min(from + 32, size)
    for (let k = 0; k < Math.min(pivots, to); k++) {
      for (let i = Math.max(from, k + 1); i < to; i++) shares[k * size + i] = a[i * size + k]
    }
  }
  return { pivots, states, shares, rates: a.slice(0, pivots * size), leaving: leaving.slice(0, pivots) }
}

function transpose({ rowStart, target, rate }: SparseRates): {
  start: Int32Array
  from: Int32Array
  rate: Float64Array
} {
  const n = rowStart.length - 1
  const start = new Int32Array(n + 1)
  for (const to of target) start[to + 1]++
  for (let i = 0; i < n; i++) start[i + 1] += start[i]
  const next = start.slice(0, n)
  const from = new Int32Array(target.length)
  const transposed = new Float64Array(target.length)
  for (let i = 0; i < n; i++) {
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      const k = next[target[arc]]++
      from[k] = i
      transposed[k] = rate[arc]
    }
  }
  return { start, from, rate: transposed }
}

/** Larger than this a share is brought down, with all others: the rest of the vector must not overflow. */
const highest = 2 ** 500

/** The stationary vector, summing to 1. Entries below about 1e-300 come out as 0. */
export function stationaryVector({ size: n, root, fronts }: Reduction): Float64Array {
  const share = new Float64Array(n)
  share[root] = 1
  for (let t = fronts.length - 1; t >= 0; t--) {
    const { pivots, states, shares } = fronts[t]
    const size = states.length
    for (let k = pivots - 1; k >= 0; k--) {
      let sum = 0
      let lost = 0
      for (let i = k + 1, at = k * size + k + 1; i < size; i++, at++) {
        const term = share[states[i]] * shares[at]
        const next = sum + term
        lost += sum >= term ? sum - next + term : term - next + sum
        sum = next
      }
      sum += lost
      share[states[k]] = sum
      if (sum > highest) for (let i = 0; i < n; i++) share[i] /= highest
    }
  }
  let sum = 0
  let lost = 0
  for (const each of share) {
    const next = sum + each
    lost += sum >= each ? sum - next + each : each - next + sum
    sum = next
  }
  const total = sum + lost
  for (let i = 0; i < n; i++) share[i] /= total
  return share
}

/**
 * Expected reward until the root is reached, from every state: x with Σ_j q_ij (x_i - x_j) = reward_i off the root and
 * x = 0 there. With reward 1 these are mean hitting times. A reward of one sign keeps all digits.
 *
 * @param reward a time unit, length n; not changed
 */
export function rewardUntilRoot({ size: n, fronts, scale }: Reduction, reward: Float64Array): Float64Array {
  const x = new Float64Array(n)
  for (let i = 0; i < n; i++) x[i] = reward[i] * scale
  for (const { pivots, states, shares } of fronts) {
    const size = states.length
    for (let k = 0; k < pivots; k++) {
      const moved = x[states[k]]
      if (moved !== 0)
        for (let i = k + 1, at = k * size + k + 1; i < size; i++, at++) x[states[i]] += shares[at] * moved
    }
  }
  const last = fronts[fronts.length - 1]
  x[last.states[last.states.length - 1]] = 0
  for (let t = fronts.length - 1; t >= 0; t--) {
    const { pivots, states, rates, leaving } = fronts[t]
    const size = states.length
    for (let k = pivots - 1; k >= 0; k--) {
      let sum = x[states[k]]
      for (let j = k + 1, at = k * size + k + 1; j < size; j++, at++) sum += rates[at] * x[states[j]]
      x[states[k]] = sum / leaving[k]
    }
  }
  return x
}

const rangeExceeded = () =>
  new StillmarkError(
    {
      code: 'range-exceeded',
      what: 'The rates differ by so much that the long-run answer can’t be followed in double precision.',
      next: 'Leave out moves that never happen in practice, or bring the rates closer together.',
    },
    'limit',
  )
