import { planElimination } from '../chain/elimination-plan.js'
import { type Reduction, reduceStates, rewardUntilRoot, stationaryVector } from '../chain/state-reduction.js'
import { aggregationLevels, type Level, leavingOf } from './aggregation-levels.js'
import { balanceResidual } from './balance-residual.js'
import type { ClosedChain } from './closed-chain.js'
import { type LinearMap, minimalResidual } from './minimal-residual.js'

/** Corrections from coarser levels fall short on grids by about this exponent (over-correction: Braess 1995). */
const overCorrection = 1.7

/**
 * A coarser level is visited twice only where it has far fewer arcs: on a closely knit graph the aggregates stay coupled
 * with all others, and visits would double from level to level at the same price each.
 */
const worthTwice = (level: Level, coarse: Level): boolean =>
  coarse.coarser !== undefined && coarse.target.length <= 0.6 * level.target.length

/** Refills the coarser rates with the flows that `share` gives, as conditional rates of the aggregates. */
function refill(level: Level, share: Float64Array): Float64Array {
  const { level: coarse, aggregateOf, arcOf } = level.coarser as NonNullable<Level['coarser']>
  const total = new Float64Array(coarse.size)
  for (let i = 0; i < level.size; i++) total[aggregateOf[i]] += share[i]
  coarse.rate.fill(0)
  const { rowStart, rate } = level
  for (let i = 0; i < level.size; i++) {
    const part = share[i] / total[aggregateOf[i]]
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++)
      if (arcOf[arc] >= 0) coarse.rate[arcOf[arc]] += part * rate[arc]
  }
  coarse.leaving.set(leavingOf(coarse, coarse.size))
  return total
}

/** One Gauss–Seidel sweep over the balance equations, forward or back; all terms are positive. */
function sweepInPlace(
  { size, intoStart, intoArc, intoFrom, rate, leaving }: Level,
  share: Float64Array,
  back: boolean,
): void {
  for (let k = 0; k < size; k++) {
    const i = back ? size - 1 - k : k
    let sum = 0
    for (let at = intoStart[i]; at < intoStart[i + 1]; at++) sum += share[intoFrom[at]] * rate[intoArc[at]]
    share[i] = sum / leaving[i]
  }
}

/**
 * One W-cycle of multilevel aggregation towards the stationary vector.
 *
 * Sources: Horton and Leutenegger 1994; over-correction: Braess 1995 (from memory).
 *
 * @param share positive, changed in place; what it sums to stays about the same
 */
export function cycleInPlace(level: Level, share: Float64Array, exponent = overCorrection): void {
  if (level.coarser === undefined) {
    const total = share.reduce((sum, each) => sum + each, 0)
    const solved = stationaryVector(reductionOf(level))
    for (let i = 0; i < share.length; i++) share[i] = total * solved[i]
    return
  }
  const { level: coarse, aggregateOf } = level.coarser
  sweepInPlace(level, share, false)
  sweepInPlace(level, share, true)
  const before = refill(level, share)
  const after = before.slice()
  cycleInPlace(coarse, after, exponent)
  if (worthTwice(level, coarse)) cycleInPlace(coarse, after, exponent)
  const factor = after.map((each, a) => (each / before[a]) ** exponent)
  for (let i = 0; i < share.length; i++) share[i] *= factor[aggregateOf[i]]
  sweepInPlace(level, share, false)
  sweepInPlace(level, share, true)
}

const reductionOf = (level: Level, root?: number): Reduction =>
  reduceStates(level, planElimination(level, { values: new Int32Array(0), width: 0 }, root))

/** Cycles that are tried, and exponents: where over-correction does not settle, the plain correction does. */
const mostCycles = 150
const onGrids = [overCorrection, 1.3, 1]
const onPairs = [1, 1.3]
/** Worst relative residual at which the cycles stop: well inside what is accepted. */
const wantedResidual = 1e-13
/** Five cycles that don't bring the residual to this part of itself have lost their grip. */
const leastGain = 0.9

/** A stationary vector by multilevel aggregation, and what is needed to solve Poisson equations on the same levels. */
export interface MultilevelSolution {
  /** Positive, summing to 1. */
  readonly share: Float64Array
  readonly cycles: number
  readonly worstRelative: number
  /** h with Σ_j q_ij (h_i - h_j) about reward_i; the mean of `reward` must be 0 but for rounding. */
  readonly poisson: (reward: Float64Array) => Float64Array
}

/** @param onCycle called after each cycle with the worst relative residual when it was last looked at; may throw to end */
export function multilevelSolution(chain: ClosedChain, onCycle?: (worst: number) => void): MultilevelSolution {
  const level = aggregationLevels(chain)
  let best = new Float64Array(chain.size).fill(1 / chain.size)
  let bestResidual = Number.POSITIVE_INFINITY
  let cycles = 0
  for (const exponent of chain.width > 0 ? onGrids : onPairs) {
    const share = best.slice()
    let last = Number.POSITIVE_INFINITY
    for (let k = 1; k <= mostCycles; k++) {
      cycleInPlace(level, share, exponent)
      cycles++
      if (k % 5 === 0) {
        normaliseInPlace(share)
        const { worstRelative } = balanceResidual(chain, share)
        if (worstRelative < bestResidual) {
          bestResidual = worstRelative
          best = share.slice()
        }
        if (bestResidual <= wantedResidual || !(worstRelative <= leastGain * last)) break
        last = worstRelative
      }
      onCycle?.(bestResidual)
    }
    if (bestResidual <= wantedResidual) break
  }
  return { share: best, cycles, worstRelative: bestResidual, poisson: poissonSolver(chain, level, best) }
}

function normaliseInPlace(share: Float64Array): void {
  let sum = 0
  for (const each of share) sum += each
  for (let i = 0; i < share.length; i++) share[i] /= sum
}

/** A level with the part of each state in its aggregate, and the elimination of the coarsest. */
interface WeightedLevel {
  readonly level: Level
  readonly part?: Float64Array
  readonly coarser?: WeightedLevel
  readonly reduction?: Reduction
}

function weighted(level: Level, share: Float64Array): WeightedLevel {
  // With the heaviest state as root, times to the root are short: nothing is multiplied by the mean time to a rare one.
  if (level.coarser === undefined) return { level, reduction: reductionOf(level, heaviest(share)) }
  const total = refill(level, share)
  const { aggregateOf } = level.coarser
  const part = share.map((each, i) => each / total[aggregateOf[i]])
  return { level, part, coarser: weighted(level.coarser.level, total) }
}

export const heaviest = (share: Float64Array): number =>
  share.reduce((most, each, state) => (each > share[most] ? state : most), 0)

/** Part of the reward's length that the equations may be missed by: below it, a bound of the size of rounding is reached. */
const wantedPart = 1e-13
const mostProducts = 100

function poissonSolver(chain: ClosedChain, level: Level, share: Float64Array): (reward: Float64Array) => Float64Array {
  let ready: WeightedLevel | undefined
  return (reward) => {
    ready ??= weighted(level, share)
    const own = ready
    const correction: LinearMap = (missed) => {
      const h = new Float64Array(chain.size)
      correctInPlace(own, h, missed)
      return h
    }
    const generator: LinearMap = (h) => {
      const image = new Float64Array(chain.size)
      const { rowStart, target, rate } = chain
      for (let i = 0; i < chain.size; i++) {
        let sum = 0
        for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) sum += rate[arc] * (h[i] - h[target[arc]])
        image[i] = sum
      }
      return image
    }
    return minimalResidual(generator, correction, reward, wantedPart, mostProducts)
  }
}

/** One W-cycle towards h with Σ_j q_ij (h_i - h_j) = reward_i. */
function correctInPlace(
  { level, part, coarser, reduction }: WeightedLevel,
  h: Float64Array,
  reward: Float64Array,
): void {
  if (level.coarser === undefined || part === undefined || coarser === undefined) {
    h.set(rewardUntilRoot(reduction as Reduction, reward))
    return
  }
  const { size, rowStart, target, rate, leaving } = level
  const relax = (back: boolean) => {
    for (let k = 0; k < size; k++) {
      const i = back ? size - 1 - k : k
      let sum = reward[i]
      for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) sum += rate[arc] * h[target[arc]]
      h[i] = sum / leaving[i]
    }
  }
  relax(false)
  relax(true)
  const { aggregateOf } = level.coarser
  const missing = new Float64Array(coarser.level.size)
  for (let i = 0; i < size; i++) {
    let sum = reward[i]
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) sum += rate[arc] * (h[target[arc]] - h[i])
    missing[aggregateOf[i]] += part[i] * sum
  }
  const correction = new Float64Array(missing.length)
  correctInPlace(coarser, correction, missing)
  if (worthTwice(level, coarser.level)) correctInPlace(coarser, correction, missing)
  for (let i = 0; i < size; i++) h[i] += correction[aggregateOf[i]]
  relax(false)
  relax(true)
}
