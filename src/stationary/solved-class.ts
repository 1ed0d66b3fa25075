import { bearableOperations, type EliminationPlan, planElimination } from '../chain/elimination-plan.js'
import { type Reduction, reduceStates, rewardUntilRoot, stationaryVector } from '../chain/state-reduction.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import { compensatedSum } from '../numbers/compensated-sum.js'
import { aggregationLevels } from './aggregation-levels.js'
import { type BalanceResidual, balanceResidual, smallestJudged } from './balance-residual.js'
import type { ClosedChain } from './closed-chain.js'
import { cycleInPlace, heaviest, multilevelSolution } from './multilevel.js'
import { generatorImage } from './poisson-residual.js'

/** The long-run shares of one closed class, and what bounds on their error are made from. */
export interface SolvedClass {
  readonly chain: ClosedChain
  /** Length n, summing to 1 within `sumError`. */
  readonly share: Float64Array
  readonly sumError: number
  readonly balance: BalanceResidual
  /** What was done: `GTH elimination`. */
  readonly method: string
  /** h with Σ_j q_ij (h_i - h_j) about reward_i, where the mean of `reward` is about 0. */
  readonly poisson: (reward: Float64Array) => Float64Array
  /**
   * Bound on the relative error of every share of at least `smallestJudged`, against the numbers as written;
   * Infinity where none is known.
   */
  readonly relativeError: number
  /**
   * Bound B: the long-run mean of any function of the state that lies between a and b has an error of at most (b - a)·B
   * against the numbers as written.
   */
  readonly spreadError: number
}

export interface SolveOptions {
  /** Refused above; 4 GB by default. */
  readonly maxMemoryBytes?: number
  /** Called with the part of the work done, 0 to 1. */
  readonly onProgress?: (done: number) => void
  readonly signal?: AbortSignal
}

const defaultMemory = 4e9

/** A solution is given out only where no single balance equation is missed by more than this part of its flow. */
export const acceptedResidual = 1e-12

/** A relative error above this is not given out: the bounds are of first order. */
const largestRelativeError = 0.01

/** Eliminations of up to so many operations are done without a look at anything else: some ten seconds. */
const cheapOperations = 3e10

/** From so many operations an arc on, a few cheap cycles first tell which state should be the root. */
const worthAGuess = 2000

/** Below this part of the heaviest share, a root is so rare that times to it would spoil the bounds. */
const rareRoot = 0.01

/** Up to so many states elimination is called by its plain name: the fronts are few and nearly full. */
const denseStates = 2000

/**
 * The stationary vector of one closed class: by elimination where that is cheap, else by multilevel aggregation, else by
 * elimination as far as memory and some minutes reach.
 *
 * @throws memory-limit, residual-too-large, range-exceeded (limit); interrupted
 */
export function solveClass(chain: ClosedChain, options: SolveOptions): SolvedClass {
  const budget = options.maxMemoryBytes ?? defaultMemory
  const stopIfCalledOff = () => {
    if (options.signal?.aborted) throw interrupted()
  }
  stopIfCalledOff()
  const plan = planElimination(chain, chain)
  if (plan.operations <= cheapOperations && plan.bytes <= budget) return solveByElimination(chain, plan, options)
  const levelsBytes = multilevelBytes(chain)
  if (levelsBytes > budget) throw memoryExceeded(chain.size, Math.min(levelsBytes, plan.bytes), budget)
  const solution = multilevelSolution(chain, (worst) => {
    stopIfCalledOff()
    // From a first residual of about 1 down to 1e-13, by its logarithm.
    options.onProgress?.(Math.min(1, Math.max(0, -Math.log10(worst) / 13)))
  })
  if (solution.worstRelative <= acceptedResidual) {
    const balance = balanceResidual(chain, solution.share)
    return {
      chain,
      share: solution.share,
      sumError: sumErrorOf(solution.share),
      balance,
      method: `multilevel aggregation (${solution.cycles} cycles)`,
      poisson: (reward) => {
        stopIfCalledOff()
        return solution.poisson(reward)
      },
      relativeError: Number.POSITIVE_INFINITY,
      spreadError: 1 + sumErrorOf(solution.share), // all that is certain of two distributions
    }
  }
  if (!(plan.operations <= bearableOperations)) throw residualTooLarge(solution.worstRelative)
  if (plan.bytes > budget) throw memoryExceeded(chain.size, plan.bytes, budget)
  return solveByElimination(chain, plan, options)
}

function solveByElimination(chain: ClosedChain, plan: EliminationPlan, options: SolveOptions): SolvedClass {
  const reduce = (how: EliminationPlan) =>
    reduceStates(chain, how, (done) => {
      if (options.signal?.aborted) throw interrupted()
      options.onProgress?.(done)
    })
  let reduction: Reduction
  let share: Float64Array
  if (plan.operations >= worthAGuess * chain.rate.length) {
    const guess = new Float64Array(chain.size).fill(1 / chain.size)
    const level = aggregationLevels(chain)
    for (let cycle = 0; cycle < 3; cycle++) cycleInPlace(level, guess)
    reduction = reduce(planElimination(chain, chain, heaviest(guess)))
    share = stationaryVector(reduction)
  } else {
    reduction = reduce(plan)
    share = stationaryVector(reduction)
    const heavy = heaviest(share)
    if (share[reduction.root] < rareRoot * share[heavy]) {
      reduction = reduce(planElimination(chain, chain, heavy))
      share = stationaryVector(reduction)
    }
  }
  const balance = balanceResidual(chain, share)
  if (!(balance.worstRelative <= acceptedResidual)) throw residualTooLarge(balance.worstRelative)
  let input = 0
  for (let arc = 0; arc < chain.rate.length; arc++) {
    input = Math.max(input, chain.rateError[arc] / chain.rate[arc])
  }
  // Rates off by a factor 1 ± η change a share by a factor within (1 ± η)^(2n): see Reduction.relativeError.
  const relativeError = (reduction.relativeError + 2 * chain.size * input) * 1.02
  return {
    chain,
    share,
    sumError: sumErrorOf(share),
    balance,
    method: chain.size <= denseStates ? 'GTH elimination' : 'sparse GTH elimination by nested dissection',
    poisson: (reward) => rewardUntilRoot(reduction, reward),
    relativeError: relativeError <= largestRelativeError ? relativeError : Number.POSITIVE_INFINITY,
    spreadError: spreadErrorOf(chain, share, balance, reduction),
  }
}

const sumErrorOf = (share: Float64Array): number => Math.abs(compensatedSum(share) - 1) + 2 ** -52

/** Levels halve or better, so they come to twice the first; the kept vectors of the Poisson solver, to 30 a state. */
const multilevelBytes = ({ size, rate }: ClosedChain): number => 2 * (28 * rate.length + 48 * size) + 240 * size

/** The entries' relative error where all entries have digits to judge, else Infinity. */
export function sharesRelativeError({ share, relativeError, spreadError }: SolvedClass): number {
  let smallest = 1
  for (const each of share) if (each < smallest) smallest = each
  const bound = smallest < smallestJudged ? Number.POSITIVE_INFINITY : Math.min(relativeError, spreadError / smallest)
  return bound <= largestRelativeError ? bound : Number.POSITIVE_INFINITY
}

/**
 * With h the solution of Q h = f - πf, the error of a computed mean is exactly Σ_i r_i (h_i - h_root), r being the
 * residual of the balance equations; and |h_i - h_root| is at most the mean time from i to the root, times (b - a).
 *
 * That time is bounded from above without trust in how it was computed: whatever t ≥ 0 has Σ_j q_ij (t_i - t_j) ≥ 1 off
 * the root is no smaller than it (the generator off the root is an M-matrix).
 */
function spreadErrorOf(
  chain: ClosedChain,
  share: Float64Array,
  balance: BalanceResidual,
  reduction: Reduction,
): number {
  const n = chain.size
  const time = rewardUntilRoot(reduction, new Float64Array(n).fill(1))
  const { image, evaluationError, inputError } = generatorImage(chain, time)
  let least = 1
  for (let i = 0; i < n; i++) {
    if (i === reduction.root) continue
    const gained = -image[i] - evaluationError[i] - inputError[i]
    if (!(gained >= least)) least = gained
  }
  if (!(least > 0)) return Number.POSITIVE_INFINITY
  let sum = 0
  for (let i = 0; i < n; i++) {
    sum += (Math.abs(balance.residual[i]) + balance.evaluationError[i] + balance.inputError[i]) * time[i]
  }
  return (sum / least) * (1 + n * 2 ** -52) + sumErrorOf(share)
}

const memoryText = (bytes: number) =>
  bytes >= 1e9 ? `${(bytes / 1e9).toPrecision(2)} GB` : `${(bytes / 1e6).toPrecision(2)} MB`

const memoryExceeded = (states: number, bytes: number, budget: number) =>
  new StillmarkError(
    {
      code: 'memory-limit',
      what: `The exact answer for ${states.toLocaleString('en-US')} states would take ${memoryText(bytes)} of memory; ${memoryText(budget)} are allowed.`,
      next: 'Allow more with --max-memory, or make the model smaller.',
    },
    'limit',
  )

const residualTooLarge = (reached: number) =>
  new StillmarkError(
    {
      code: 'residual-too-large',
      what: `The exact answer was not reached: one balance equation is still missed by ${reached.toExponential(1)} of its flow, and ${acceptedResidual} is the most that is accepted.`,
      next: 'Bring the rates closer together, or make the model smaller.',
    },
    'limit',
  )

const interrupted = () => new StillmarkError({ code: 'interrupted', what: 'The solution was stopped.' }, 'interrupted')
