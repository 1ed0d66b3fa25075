import type { Observations } from '../../src/simulation/observations.js'

/** Batch means of a measure that is a single mean. */
export function batchMeansOf({ measures }: Observations, name: string): number[] {
  const measure = measures[name]
  if (measure?.kind !== 'mean') throw new Error(`${name} is no mean`)
  return Array.from(measure.batchMeans)
}

export function sharesOf({ measures }: Observations, name: string) {
  const measure = measures[name]
  if (measure?.kind !== 'histogram') throw new Error(`${name} is no histogram`)
  return measure
}

export const meanOf = (numbers: readonly number[]) => numbers.reduce((sum, x) => sum + x, 0) / numbers.length

/** Deviation of the mean of replications from a value, in standard errors estimated from the replications. */
export function deviations(observed: Observations, name: string, expected: number): number {
  const { replications, batches } = observed.settings
  const batchMeans = batchMeansOf(observed, name)
  const means = Array.from({ length: replications }, (_, r) => meanOf(batchMeans.slice(r * batches, (r + 1) * batches)))
  const mean = meanOf(means)
  const variance = means.reduce((sum, x) => sum + (x - mean) ** 2, 0) / (replications - 1)
  return (mean - expected) / Math.sqrt(variance / replications)
}

/** What bears on the digits: all but the workers and the clock. */
export const digitsOf = (observed: Observations) => JSON.stringify({ ...observed, workers: 0, seconds: 0 })
