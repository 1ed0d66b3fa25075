import type { Chain } from '../chain/chain.js'
import { joinArcs } from '../chain/joined-arcs.js'
import { structureOf } from '../chain/structure.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import { newMoves } from '../model/compile.js'
import type { VariablesModel } from '../model/model.js'
import { type LevelStructure, stateAt } from '../recurrence/classification.js'
import { type LevelDrift, levelDrift } from './certified-truncation-drift.js'
import { closedChain } from './closed-chain.js'
import { generatorImage } from './poisson-residual.js'
import { type Growth, growthAt } from './solve-unbounded-growth.js'
import { type SolvedClass, type SolveOptions, solveClass } from './solved-class.js'

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

/** e^-80 = 2e-35: what is cut off is to weigh less than this, before growth is counted. */
const wanted = 80

/**
 * Cuts off the levels from some point on; moves that would leave stay where they are.
 *
 * Watched only while it is in the kept states, the true process differs from the truncated one only in where it goes on
 * after leaving. So with h the solution of Q h = f - mean on the kept states, the mean changes by at most the rate of
 * leaving times twice the largest |h| (Meyer 1980 and Courtois and Semal 1984, in this form our own derivation). The rate
 * of leaving is bounded by the drift function, |h| by twice the size of f times the mean time to one state, and that time
 * by a vector whose inequalities are checked.
 *
 * @param growth the largest growth of what will be averaged
 * @throws too-many-levels, near-balance (limit) and what `solveClass` throws
 */
export function truncateLevels(
  model: VariablesModel,
  structure: LevelStructure,
  growth: Growth,
  options: SolveOptions,
): TruncatedLevels {
  const drift = levelDrift(structure, wanted)
  const perLevel = Math.log(drift.base)
  let levels = Math.ceil((wanted + Math.log(Math.max(1, drift.constant))) / perLevel) + 2
  // Polynomial growth and long times cost a few levels more.
  levels += Math.ceil(((growth.length + 1) * Math.log(largestAt(structure, levels))) / perLevel)
  const states = structure.boundary.length + levels * structure.phases.length
  if (states > mostStates) throw tooManyLevels(states)
  const chain = keptChain(model, structure, levels)
  const joined = joinArcs(chain)
  const found = structureOf(chain, joined)
  const [closed] = found.closedClasses
  if (found.closedClasses.length !== 1 || closed.states.length !== chain.size) throw notConnected()
  const solved = solveClass(closedChain(chain, joined, closed), options)
  const time = longestTime(solved)
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
    changeOf: (size) => (flow * 4 * time + 2 * cutOff) * size * (1 + 2 ** -20),
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
  const indexOf = new Map(states.map((state, k) => [state.join(' '), k] as const))
  const values = new Int32Array(size * width)
  const rowStart = new Int32Array(size + 1)
  const target: number[] = []
  const rate: number[] = []
  const rateError: number[] = []
  const label: number[] = []
  const moves = newMoves(width)
  states.forEach((state, k) => {
    values.set(state, k * width)
    model.expand(state, moves)
    for (let move = 0; move < moves.count; move++) {
      const next = Array.from(moves.next.subarray(move * width, (move + 1) * width)).join(' ')
      target.push(indexOf.get(next) ?? k)
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

/**
 * Bound on the mean time from any state to one of them: whatever t ≥ 0 has Σ_j q_ij (t_i - t_j) ≥ 1 off the root is no
 * smaller than it.
 */
function longestTime(solved: SolvedClass): number {
  const n = solved.chain.size
  const time = solved.poisson(new Float64Array(n).fill(1))
  const root = time.indexOf(0)
  if (n === 1) return 0
  const { image, evaluationError, inputError } = generatorImage(solved.chain, time)
  let least = 1
  let most = 0
  for (let i = 0; i < n; i++) {
    if (!(time[i] >= 0)) return Number.POSITIVE_INFINITY
    most = Math.max(most, time[i])
    if (i !== root) least = Math.min(least, -image[i] - evaluationError[i] - inputError[i])
  }
  return root >= 0 && least > 0 ? most / least : Number.POSITIVE_INFINITY
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

const notConnected = () =>
  new StillmarkError(
    {
      code: 'levels-apart',
      what: 'The lowest levels of the model lead to each other only through higher ones, so they can’t be solved on their own.',
      next: 'Give the unbounded variable an upper bound that it hardly ever reaches.',
    },
    'limit',
  )
