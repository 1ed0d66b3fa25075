import { planElimination } from '../chain/elimination-plan.js'
import { type Reduction, reduceStates, rewardUntilRoot, stationaryVector } from '../chain/state-reduction.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import { compensatedSum } from '../numbers/compensated-sum.js'
import { type BalanceResidual, balanceResidual, smallestJudged } from './balance-residual.js'
import type { ClosedChain } from './closed-chain.js'
import { generatorImage } from './poisson-residual.js'

/** The long-run shares of one closed class, and what bounds on their error are made from. */
export interface SolvedClass {
  readonly chain: ClosedChain
  /** Length n, summing to 1 within `sumError`. */
  readonly share: Float64Array
  readonly sumError: number
  readonly balance: BalanceResidual
  readonly reduction: Reduction
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

/** @throws memory-limit, residual-too-large (limit); interrupted */
export function solveClass(chain: ClosedChain, options: SolveOptions): SolvedClass {
  const plan = planElimination(chain, chain)
  const budget = options.maxMemoryBytes ?? defaultMemory
  if (plan.bytes > budget) throw memoryExceeded(chain.size, plan.bytes, budget)
  const reduction = reduceStates(chain, plan, (done) => {
    if (options.signal?.aborted) throw interrupted()
    options.onProgress?.(done)
  })
  const share = stationaryVector(reduction)
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
    sumError: Math.abs(compensatedSum(share) - 1) + 2 ** -52,
    balance,
    reduction,
    relativeError: relativeError <= largestRelativeError ? relativeError : Number.POSITIVE_INFINITY,
    spreadError: spreadErrorOf(chain, share, balance, reduction),
  }
}

/** The entries' relative error where all entries have digits to judge, else Infinity. */
export function sharesRelativeError({ share, relativeError, spreadError }: SolvedClass): number {
  let smallest = 1
  for (const each of share) if (each < smallest) smallest = each
  return smallest < smallestJudged ? Number.POSITIVE_INFINITY : Math.min(relativeError, spreadError / smallest)
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
  const total = Math.abs(compensatedSum(share) - 1) + 2 ** -52
  return (sum / least) * (1 + n * 2 ** -52) + total
}

const gigabytes = (bytes: number) => `${(bytes / 1e9).toPrecision(2)} GB`

const memoryExceeded = (states: number, bytes: number, budget: number) =>
  new StillmarkError(
    {
      code: 'memory-limit',
      what: `The exact answer for ${states.toLocaleString('en-US')} states would take ${gigabytes(bytes)} of memory; ${gigabytes(budget)} are allowed.`,
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
