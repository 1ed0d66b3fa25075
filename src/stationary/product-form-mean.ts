import { StillmarkError } from '../errors/stillmark-error.js'
import { productError, sumError } from '../numbers/double-double.js'
import { type CountShares, tailOf } from './birth-death.js'
import type { BoundedValue } from './mean-value.js'
import type { IndependentCount, IndependentCounts } from './product-form.js'
import { type Growth, growthAt } from './solve-unbounded-growth.js'

/** A function of the state, with a bound on the error of each value. */
export type BoundedFunction = (state: Float64Array) => BoundedValue

/** More states than this are not visited for one term of a measure. */
const mostJointStates = 2e7

/** Where several counts are taken together, what lies beyond the ones visited weighs less than this. */
const jointTail = 1e-36

/** Share of time at each value of a function, and what the shares may be off by in sum. */
export interface ValueShares {
  /** Ascending. */
  readonly values: Float64Array
  readonly shares: Float64Array
  /** Bound on the relative error of each share. */
  readonly relativeError: number
  /** Bound on the share of all states that were not visited. */
  readonly beyond: number
  readonly valueError: number
}

/**
 * Long-run mean of a function of some of the counts, the others held at their lowest.
 *
 * @param members indices into `counts`
 * @param growth bound on the function's size
 * @throws joint-too-large (limit)
 */
export function meanOver(
  { base, counts }: IndependentCounts,
  members: readonly number[],
  of: BoundedFunction,
  growth: Growth,
  measure: string,
): BoundedValue {
  let sum = 0
  let lost = 0
  let size = 0
  let error = 0
  const visited = visit({ base, counts }, members, measure, (state, share) => {
    const { value, errorBound } = of(state)
    const term = share * value
    const next = sum + term
    lost += productError(share, value, term) + sumError(sum, term, next)
    sum = next
    size += Math.abs(term)
    error += share * errorBound
  })
  const value = sum + lost
  const outside = base.reduce((most, each) => Math.max(most, Math.abs(each)), 1)
  const beyond = visited.beyondOf(growth, outside)
  return {
    value,
    errorBound:
      (error + visited.relativeError * size + beyond + 2 ** -52 * Math.abs(value) + 2 ** -80 * size) * (1 + 2 ** -20),
  }
}

/** How the values of a function are shared out. @throws joint-too-large (limit) */
export function valueShares(
  independent: IndependentCounts,
  members: readonly number[],
  of: BoundedFunction,
  measure: string,
): ValueShares {
  const byValue = new Map<number, { share: number; lost: number }>()
  let valueError = 0
  const visited = visit(independent, members, measure, (state, share) => {
    const { value, errorBound } = of(state)
    valueError = Math.max(valueError, errorBound)
    const known = byValue.get(value + 0)
    if (known === undefined) {
      byValue.set(value + 0, { share, lost: 0 })
      return
    }
    const next = known.share + share
    known.lost += sumError(known.share, share, next)
    known.share = next
  })
  const values = Float64Array.from(byValue.keys()).sort()
  return {
    values,
    shares: values.map((value) => {
      const { share, lost } = byValue.get(value) as { share: number; lost: number }
      return share + lost
    }),
    relativeError: visited.relativeError + 2 ** -52,
    beyond: visited.beyondOf([1], 1),
    valueError,
  }
}

interface Visited {
  readonly relativeError: number
  readonly beyondOf: (growth: Growth, outside: number) => number
}

function visit(
  { base, counts }: IndependentCounts,
  members: readonly number[],
  measure: string,
  onState: (state: Float64Array, share: number) => void,
): Visited {
  const own = members.map((k) => counts[k])
  const kept = own.map(({ shares }) => (own.length === 1 ? shares.share.length : keptOf(shares)))
  const total = kept.reduce((product, each) => product * each, 1)
  if (total > mostJointStates) throw jointTooLarge(measure, total)
  const state = Float64Array.from(base)
  for (const { element, outward, shares } of counts) state[element] = outward * shares.first
  const place = (depth: number, share: number): void => {
    if (depth === own.length) {
      onState(state, share)
      return
    }
    const { element, outward, shares } = own[depth]
    for (let k = 0; k < kept[depth]; k++) {
      if (shares.share[k] === 0) continue
      state[element] = outward * (shares.first + k)
      place(depth + 1, share * shares.share[k])
    }
    state[element] = outward * shares.first
  }
  place(0, 1)
  return {
    relativeError: own.reduce((sum, { shares }) => sum + shares.relativeError + 2 ** -53, 0) * (1 + 2 ** -20),
    beyondOf: (growth, outside) => beyondOf(own, kept, growth, outside),
  }
}

/** Σ over the states not visited: some count is beyond its last, and P of the largest is at most the sum of the P of each. */
function beyondOf(own: readonly IndependentCount[], kept: readonly number[], growth: Growth, outside: number): number {
  const pieces = own.map(({ shares }, k) => ({
    tail: beyondIndex(shares, kept[k], growth, outside),
    share: beyondIndex(shares, kept[k], [1], 1),
    mean: beyondIndex(shares, 0, growth, outside),
  }))
  let bound = 0
  pieces.forEach(({ tail, share }, i) => {
    bound += tail
    pieces.forEach(({ mean }, j) => {
      if (i !== j) bound += mean * share
    })
  })
  return bound * (1 + 2 ** -20)
}

/** Σ p(n) P(s) over the counts from first + `index` on, rounded up. */
function beyondIndex(shares: CountShares, index: number, growth: Growth, outside: number): number {
  let sum = tailOf(shares, growth, outside)
  for (let k = index; k < shares.share.length; k++) {
    const s = Math.max(1, outside, Math.abs(shares.first + k))
    sum += shares.share[k] * growthAt(growth, s)
  }
  const largest = Math.max(1, outside, Math.abs(shares.first), shares.first + shares.share.length)
  const vanished = shares.vanished * shares.share.length * growthAt(growth, largest)
  return (sum + vanished) * (1 + 2 ** -30)
}

function keptOf({ share }: CountShares): number {
  let tail = 0
  let k = share.length
  while (k > 1 && tail + share[k - 1] < jointTail) tail += share[--k]
  return k
}

const jointTooLarge = (measure: string, states: number) =>
  new StillmarkError(
    {
      code: 'joint-too-large',
      where: { key: `measures.${measure}` },
      what: `The measure "${measure}" ties several stations together, over ${states.toExponential(1)} states.`,
      next: 'Ask for the stations one by one, or for sums over them.',
    },
    'limit',
  )
