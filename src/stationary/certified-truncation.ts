import type { Chain } from '../chain/chain.js'
import { joinArcs } from '../chain/joined-arcs.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import { newMoves } from '../model/compile.js'
import type { VariablesModel } from '../model/model.js'
import { compensatedSum } from '../numbers/compensated-sum.js'
import { type LevelStructure, stateAt } from '../recurrence/classification.js'
import { balanceResidual } from './balance-residual.js'
import { type LevelDrift, levelDrift } from './certified-truncation-drift.js'
import type { ClosedChain } from './closed-chain.js'
import { generatorImage } from './poisson-residual.js'
import { levelShares, type QuasiBirthDeath, quasiBirthDeath, rewardOfLevels } from './quasi-birth-death.js'
import { type Growth, growthAt } from './solve-unbounded-growth.js'
import { acceptedResidual, type SolvedClass } from './solved-class.js'

/** The lowest levels of a quasi-birth-death process, solved on their own, with what the rest can change. */
export interface TruncatedLevels {
  readonly chain: Chain
  readonly solved: SolvedClass
  /** Levels kept. */
  readonly levels: number
  /** Bound on the long-run share of all levels that were cut off, and of the last one kept. */
  readonly cutOff: number
  /** Bound on what cutting off changes in the long-run mean of a function that lies within -`size` … `size` on the kept states. */
  readonly changeOf: (size: number) => number
  /** Bound on the part of a mean that lies beyond the kept levels. */
  readonly beyondOf: (growth: Growth) => number
}

/** More states than this are not solved. */
const mostStates = 1_500_000

/** e^-60 = 1e-26: what is cut off is to weigh less than this, before growth is counted. */
const wanted = 60

/**
 * Cuts off the levels from some point on; moves that would leave stay where they are.
 *
 * Watched only while it is in the kept states, the true process differs from the truncated one only in where it goes on
 * after leaving. So with h the solution of Q h = f - mean on the kept states, the mean changes by at most the rate of
 * leaving times twice the spread of h (Meyer 1980 and Courtois and Semal 1984, in this form our own derivation). The rate
 * of leaving is bounded by the drift function, that spread by four times the size of f times the mean time to one state, and that time
 * by a vector whose inequalities are checked.
 *
 * @param growth the largest growth of what will be averaged
 * @throws too-many-levels, near-balance (limit), residual-too-large (limit)
 */
export function truncateLevels(model: VariablesModel, structure: LevelStructure, growth: Growth): TruncatedLevels {
  const drift = levelDrift(structure, wanted)
  const perLevel = Math.log(drift.base)
  let levels = Math.ceil((wanted + Math.log(Math.max(1, drift.constant))) / perLevel) + 2
  // Polynomial growth and long times cost a few levels more.
  levels += Math.ceil(((growth.length + 1) * Math.log(largestAt(structure, levels))) / perLevel)
  const states = structure.boundary.length + levels * structure.phases.length
  if (states > mostStates) throw tooManyLevels(states)
  const chain = keptChain(model, structure, levels)
  const solved = solveKept(chain, structure, levels)
  const cutOff = Math.min(1, drift.constant * Math.exp(-perLevel * (levels - 1)) * (1 + 2 ** -20))
  let leaving = 0
  const { up } = structure
  const m = structure.phases.length
  for (let i = 0; i < m; i++) {
    let rate = 0
    for (let j = 0; j < m; j++) rate += up.value[i * m + j]
    leaving = Math.max(leaving, rate)
  }
  const flow = cutOff < 0.5 ? (cutOff * leaving) / (1 - cutOff) : Number.POSITIVE_INFINITY
  return {
    chain,
    solved,
    levels,
    cutOff,
    changeOf: (size) => (flow * 8 * solved.time + 2 * cutOff) * size * (1 + 2 ** -20),
    beyondOf: (growth) => beyondLevels(structure, drift, levels, growth),
  }
}

/** The largest |integer| in the states of a level. */
function largestAt({ phases, levelStep, element, boundary }: LevelStructure, level: number): number {
  let most = 1
  phases.forEach((state, phase) => {
    state.forEach((value, k) => {
      most = Math.max(most, Math.abs(k === element ? value + level * levelStep[phase] : value))
    })
  })
  for (const state of boundary) for (const value of state) most = Math.max(most, Math.abs(value))
  return most
}

/** Σ over the levels from `levels` on of constant · base^-level · P(s). */
function beyondLevels(structure: LevelStructure, { base, constant }: LevelDrift, levels: number, growth: Growth) {
  const s = largestAt(structure, levels)
  const step = structure.levelStep.reduce((most, each) => Math.max(most, Math.abs(each)), 0)
  const ratio = ((1 + step / s) ** (growth.length - 1) / base) * (1 + 2 ** -40)
  if (!(ratio < 1)) return Number.POSITIVE_INFINITY
  return ((constant * Math.exp(-levels * Math.log(base)) * growthAt(growth, s)) / (1 - ratio)) * (1 + 2 ** -20)
}

function keptChain(model: VariablesModel, structure: LevelStructure, levels: number): Chain {
  const { width } = model
  const { boundary, phases } = structure
  const size = boundary.length + levels * phases.length
  const states: number[][] = [...boundary.map((state) => [...state])]
  for (let level = 0; level < levels; level++) {
    for (let phase = 0; phase < phases.length; phase++) states.push(stateAt(structure, level, phase))
  }
  const values = new Int32Array(size * width)
  const rowStart = new Int32Array(size + 1)
  const indexOf = stateIndex(states, width)
  const target: number[] = []
  const rate: number[] = []
  const rateError: number[] = []
  const label: number[] = []
  const moves = newMoves(width)
  states.forEach((state, k) => {
    values.set(state, k * width)
    model.expand(state, moves)
    for (let move = 0; move < moves.count; move++) {
      const next = indexOf(moves.next, move * width)
      target.push(next < 0 ? k : next)
      rate.push(moves.rate[move])
      rateError.push(moves.rateError[move])
      label.push(moves.label[move])
    }
    rowStart[k + 1] = target.length
  })
  return {
    time: model.time,
    size,
    start: 0,
    width,
    values,
    elements: model.elements,
    rowStart,
    target: Int32Array.from(target),
    rate: Float64Array.from(rate),
    rateError: Float64Array.from(rateError),
    label: Int32Array.from(label),
  }
}

/** Position of a state that starts at `offset` of an array, -1 where it is not among them. */
function stateIndex(states: readonly (readonly number[])[], width: number) {
  const low = new Array<number>(width).fill(Number.POSITIVE_INFINITY)
  const high = new Array<number>(width).fill(Number.NEGATIVE_INFINITY)
  for (const state of states) {
    for (let k = 0; k < width; k++) {
      if (state[k] < low[k]) low[k] = state[k]
      if (state[k] > high[k]) high[k] = state[k]
    }
  }
  const packs = low.reduce((product, least, k) => product * (high[k] - least + 1), 1) < 2 ** 53
  const keyOf = (values: ArrayLike<number>, offset: number): number | string => {
    if (!packs) return Array.from({ length: width }, (_, k) => values[offset + k]).join(' ')
    let key = 0
    for (let k = 0; k < width; k++) {
      const value = values[offset + k]
      if (value < low[k] || value > high[k]) return -1
      key = key * (high[k] - low[k] + 1) + (value - low[k])
    }
    return key
  }
  const positions = new Map<number | string, number>()
  states.forEach((state, k) => {
    positions.set(keyOf(state, 0), k)
  })
  return (values: ArrayLike<number>, offset: number): number => positions.get(keyOf(values, offset)) ?? -1
}

/**
 * The kept states as a chain of their own. Where the last level is left upwards, it is met again as the whole process would
 * meet it (by the rates `up` · G): any rates may stand there, these make the shares those of the whole process.
 */
function closedUpwards(chain: Chain, { structure, excursion }: QuasiBirthDeath): ClosedChain {
  const joined = joinArcs(chain)
  const n = chain.size
  const m = structure.phases.length
  const rowStart = new Int32Array(n + 1)
  const target: number[] = []
  const rate: number[] = []
  const rateError: number[] = []
  for (let i = 0; i < n; i++) {
    const back = new Map<number, number>()
    if (i >= n - m) {
      for (let j = 0; j < m; j++) {
        const value = excursion[(i - n + m) * m + j]
        if (value > 0 && i !== n - m + j) back.set(n - m + j, value)
      }
    }
    for (let arc = joined.rowStart[i]; arc < joined.rowStart[i + 1]; arc++) {
      const to = joined.target[arc]
      if (to === i) continue
      const more = back.get(to)
      back.delete(to)
      target.push(to)
      rate.push(joined.rate[arc] + (more ?? 0))
      rateError.push(joined.rateError[arc] + (more === undefined ? 0 : 2 ** -53 * (joined.rate[arc] + more)))
    }
    for (const [to, value] of back) {
      target.push(to)
      rate.push(value)
      rateError.push(0)
    }
    rowStart[i + 1] = target.length
  }
  return {
    size: n,
    states: Int32Array.from({ length: n }, (_, i) => i),
    rowStart,
    target: Int32Array.from(target),
    rate: Float64Array.from(rate),
    rateError: Float64Array.from(rateError),
    values: chain.values,
    width: chain.width,
  }
}

/** The kept states solved in matrix-geometric form. Bounds are made from what the solution misses, however it was computed. */
function solveKept(chain: Chain, structure: LevelStructure, levels: number): SolvedClass & { readonly time: number } {
  const process = quasiBirthDeath(structure)
  const closed = closedUpwards(chain, process)
  const share = levelShares(process, levels)
  const balance = balanceResidual(closed, share)
  if (!(balance.worstRelative <= acceptedResidual)) throw notReached(balance.worstRelative)
  const poisson = (reward: Float64Array) => rewardOfLevels(process, reward, levels)
  const time = poisson(new Float64Array(chain.size).fill(1))
  const least = leastGain(closed, time)
  let missed = 0
  let longest = 0
  for (let i = 0; i < chain.size; i++) {
    missed += (Math.abs(balance.residual[i]) + balance.evaluationError[i] + balance.inputError[i]) * time[i]
    longest = Math.max(longest, time[i])
  }
  const sumError = Math.abs(compensatedSum(share) - 1) + 2 ** -52
  return {
    chain: closed,
    share,
    sumError,
    balance,
    method: 'quasi-birth-death process by logarithmic reduction',
    poisson,
    relativeError: Number.POSITIVE_INFINITY,
    spreadError: least > 0 ? (missed / least) * (1 + chain.size * 2 ** -52) + sumError : Number.POSITIVE_INFINITY,
    time: least > 0 ? longest / least : Number.POSITIVE_INFINITY,
  }
}

/**
 * The smallest Σ_j q_ij (t_i - t_j) off the one state where t = 0, for t ≥ 0: where it is positive, t over it is no smaller
 * than the mean time to that state (the generator off it is an M-matrix).
 */
function leastGain(chain: ClosedChain, time: Float64Array): number {
  const root = time.indexOf(0)
  if (root < 0 || time.some((each, i) => i !== root && !(each > 0))) return Number.NaN
  const { image, evaluationError, inputError } = generatorImage(chain, time)
  let least = 1
  for (let i = 0; i < chain.size; i++) {
    if (i !== root) least = Math.min(least, -image[i] - evaluationError[i] - inputError[i])
  }
  return least
}

const tooManyLevels = (states: number) =>
  new StillmarkError(
    {
      code: 'too-many-levels',
      what: `The exact answer would need ${states.toLocaleString('en-US')} states until what lies beyond is negligible; ${mostStates.toLocaleString('en-US')} are the most that are solved.`,
      next: 'Bring the model further from balance, or make it smaller.',
    },
    'limit',
  )

const notReached = (reached: number) =>
  new StillmarkError(
    {
      code: 'residual-too-large',
      what: `The exact answer was not reached: one balance equation is still missed by ${reached.toExponential(1)} of its flow, and ${acceptedResidual} is the most that is accepted.`,
      next: 'Bring the rates closer together, or make the model smaller.',
    },
    'limit',
  )
