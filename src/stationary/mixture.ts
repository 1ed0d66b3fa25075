import { type BoundedValue, meanValue, type StateFunction } from './mean-value.js'
import type { SolvedClass } from './solved-class.js'

/** A closed class with the probability of ending in it. */
export interface WeightedClass {
  readonly solved: SolvedClass
  readonly weight: number
  readonly weightError: number
}

/**
 * Long-run mean over several closed classes, weighted by the probabilities of ending in each; errors of those
 * probabilities count by how far the classes lie apart.
 *
 * @param functions one a class, on its own states
 */
export function mixedMean(
  classes: readonly WeightedClass[],
  functions: readonly StateFunction[],
  sharp = true,
): BoundedValue {
  const means = classes.map(({ solved }, k) => meanValue(solved, functions[k], sharp))
  if (classes.length === 1) return means[0]
  let value = 0
  let errorBound = 0
  let magnitude = 0
  // The weights' errors add up to nothing, so any constant may be taken off: the middle of the means.
  const values = means.map((mean) => mean.value)
  const middle = (Math.min(...values) + Math.max(...values)) / 2
  for (let k = 0; k < classes.length; k++) {
    const { weight, weightError } = classes[k]
    const { value: mean, errorBound: bound } = means[k]
    value += weight * mean
    magnitude += weight * Math.abs(mean)
    errorBound += weight * bound + weightError * (Math.abs(mean - middle) + bound)
  }
  // Weights that sum to 1 only within rounding, and the roundings of the sum itself.
  return {
    value,
    errorBound: errorBound * (1 + 2 ** -40) + (2 * classes.length + 2) * 2 ** -53 * (magnitude + Math.abs(middle)),
  }
}
