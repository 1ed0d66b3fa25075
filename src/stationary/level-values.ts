import type { Chain } from '../chain/chain.js'
import type { Model, StateValue } from '../model/model.js'
import { add, compare, type Fraction, fractionOfText, zero } from '../numbers/fraction.js'
import type { ExactMeasure } from './exact-answer.js'
import { exactArcs } from './exact-arcs.js'
import type { StateFunction } from './mean-value.js'
import { mixedMean, type WeightedClass } from './mixture.js'
import { largestRational, solveRationally } from './rational-solution.js'
import { valuesIn } from './state-functions.js'

/** Up to so many points, and so many points times states, each gets a bound of its own; beyond it one serves all. */
const sharpPoints = 64
const sharpEntries = 1e6

/** A bound for all that is no better than this says nothing: then each point gets its own, whatever it takes. */
const uselessBound = 1e-3

/** The distinct values of a function, ascending, and which states take each. */
interface Levels {
  readonly values: Float64Array
  /** By class: index into `values` of each of its states. */
  readonly levelOf: readonly Int32Array[]
  /** Bound on the error of the values. */
  readonly valueError: number
}

function levelsOf(functions: readonly StateFunction[]): Levels {
  const distinct = new Set<number>()
  let valueError = 0
  for (const { value, error } of functions) {
    // -0 and 0 are one value.
    for (const each of value) distinct.add(each + 0)
    for (const each of error) if (each > valueError) valueError = each
  }
  const values = Float64Array.from(distinct).sort()
  const indexOf = new Map<number, number>()
  values.forEach((value, k) => {
    indexOf.set(value, k)
  })
  const levelOf = functions.map(({ value }) => Int32Array.from(value, (each) => indexOf.get(each + 0) as number))
  return { values, levelOf, valueError }
}

/** The indicator of the states whose level satisfies a condition. */
const indicators = ({ levelOf }: Levels, holds: (level: number) => boolean): StateFunction[] =>
  levelOf.map((levels) => ({
    value: Float64Array.from(levels, (level) => (holds(level) ? 1 : 0)),
    error: new Float64Array(levels.length),
  }))

/** Long-run share of time at each value, by value. The error bound is the largest of the points'. */
export function distributionOf(
  chain: Chain,
  classes: readonly WeightedClass[],
  of: StateValue,
  measure: string,
): ExactMeasure {
  const levels = levelsOf(classes.map(({ solved }) => valuesIn(chain, solved.chain.states, of, measure)))
  const count = levels.values.length
  const entries = classes.reduce((sum, { solved }) => sum + count * solved.chain.size, 0)
  const useless = classes.some(({ solved }) => solved.spreadError > uselessBound)
  if (count <= sharpPoints && (entries <= sharpEntries || useless)) {
    const means = Array.from(levels.values, (_, k) =>
      mixedMean(
        classes,
        indicators(levels, (level) => level === k),
      ),
    )
    return {
      points: means.map(({ value }, k) => [levels.values[k], value] as const),
      errorBound: Math.max(...means.map(({ errorBound }) => errorBound)),
    }
  }
  const shares = sharesByLevel(classes, levels)
  let errorBound = 0
  for (const share of shares) errorBound = Math.max(errorBound, shareError(classes, share))
  return { points: Array.from(levels.values, (value, k) => [value, shares[k]] as const), errorBound }
}

function sharesByLevel(classes: readonly WeightedClass[], { values, levelOf }: Levels): Float64Array {
  const shares = new Float64Array(values.length)
  const lost = new Float64Array(values.length)
  classes.forEach(({ solved, weight }, c) => {
    const levels = levelOf[c]
    for (let k = 0; k < levels.length; k++) {
      const level = levels[k]
      const term = weight * solved.share[k]
      const next = shares[level] + term
      lost[level] += shares[level] >= term ? shares[level] - next + term : term - next + shares[level]
      shares[level] = next
    }
  })
  for (let k = 0; k < shares.length; k++) shares[k] += lost[k]
  return shares
}

/** Bound on the error of a share of time that was computed as `share`, whatever the states are that make it up. */
function shareError(classes: readonly WeightedClass[], share: number): number {
  let bound = 2 ** -51 * share
  let relative = 0
  let spread = 0
  for (const { solved, weight, weightError } of classes) {
    relative = Math.max(relative, solved.relativeError + (weight > 0 ? weightError / weight : 0))
    spread += weight * solved.spreadError + weightError
  }
  bound += Math.min(relative * share, spread)
  return bound * (1 + 2 ** -20)
}

/**
 * The smallest value v with share(expression ≤ v) ≥ level. Decided beyond the error bound of the shares; where they are
 * too close to the level for that, in exact fractions (small rational chains), else the error bound says how far the
 * value may be off.
 */
export function quantileOf(
  model: Model,
  chain: Chain,
  classes: readonly WeightedClass[],
  of: StateValue,
  level: number,
  measure: string,
): ExactMeasure {
  const functions = classes.map(({ solved }) => valuesIn(chain, solved.chain.states, of, measure))
  const levels = levelsOf(functions)
  const shares = sharesByLevel(classes, levels)
  const last = levels.values.length - 1
  const upTo = (k: number) =>
    mixedMean(
      classes,
      indicators(levels, (each) => each <= k),
    )
  let crude = 0
  let k = 0
  for (; k < last; k++) {
    crude += shares[k]
    if (crude >= level) break
  }
  // The crude sum may be off by a little: search for where the bound decides, on both sides. The last level holds all.
  const surely = (each: number) => {
    const { value, errorBound } = upTo(each)
    return value - errorBound >= level
  }
  const high = k < last && !surely(k) ? first(k + 1, last, surely) : k
  const low = first(0, k, (each) => {
    const { value, errorBound } = upTo(each)
    return value + errorBound >= level
  })
  if (low === high) return { value: levels.values[low], errorBound: levels.valueError }
  const exact = exactShares(model, chain, classes, levels)
  const wanted = fractionOfText(String(level))
  if (exact !== undefined && wanted !== undefined) {
    let sum: Fraction = zero
    for (let each = 0; each <= last; each++) {
      sum = add(sum, exact[each])
      if (compare(sum, wanted) >= 0) return { value: levels.values[each], errorBound: levels.valueError }
    }
  }
  const value = levels.values[k]
  const furthest = Math.max(value - levels.values[low], levels.values[high] - value)
  return { value, errorBound: furthest + levels.valueError }
}

/** The first of from … to that holds, where all behind one that holds do too; `to` is taken to hold. */
function first(from: number, to: number, holds: (k: number) => boolean): number {
  let low = from
  let high = to
  // Most often the answer is at the given end already.
  if (low < high && !holds(high - 1)) return high
  while (low < high) {
    const middle = (low + high) >> 1
    if (holds(middle)) high = middle
    else low = middle + 1
  }
  return low
}

/** Exact share of time at each value; undefined where the chain is too large, irrational, or has several classes. */
function exactShares(
  model: Model,
  chain: Chain,
  classes: readonly WeightedClass[],
  { values, levelOf }: Levels,
): Fraction[] | undefined {
  // Probabilities of ending in one of several classes are known in doubles only.
  if (classes.length !== 1 || classes[0].solved.chain.size > largestRational) return undefined
  const { states, size } = classes[0].solved.chain
  const arcs = exactArcs(model, chain, states)
  if (arcs === undefined) return undefined
  const shares = solveRationally(size, arcs)
  const byLevel = new Array<Fraction>(values.length).fill(zero)
  shares.forEach((share, k) => {
    byLevel[levelOf[0][k]] = add(byLevel[levelOf[0][k]], share)
  })
  return byLevel
}
