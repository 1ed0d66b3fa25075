import type { Prediction } from '../comparison/compare-measure.js'
import { type TimeAverage, timeAverage } from '../dynamics/time-average.js'
import { transientCost, transientDistribution } from '../dynamics/transient-distribution.js'
import { normalTailQuantile } from '../numbers/distributions.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import { measureRewards } from '../stationary/measure-rewards.js'
import type { Ground } from './ground.js'

/** States up to which the run is predicted exactly as a matter of course. */
const mostStates = 20_000
/** Multiplications that the bias after the warm-up may take. */
const mostMultiplications = 5e8

/**
 * Time averages of every mean and ratio, where the chain is of moderate size and ends in one class; empty otherwise.
 */
export function knownTimeAverages(
  ground: Ground,
  exact: ExactAnswer | undefined,
): Readonly<Record<string, TimeAverage>> {
  const { finite, model } = ground
  if (finite === undefined || exact?.solved?.length !== 1 || finite.chain.size > mostStates) return {}
  const [solved] = exact.solved
  const rewards = measureRewards(model, finite.chain, solved)
  return Object.fromEntries(
    Object.entries(rewards).map(([name, reward]) => [name, timeAverage(finite.chain, solved, reward)]),
  )
}

/** What theory says of a run: half-widths at a confidence, and the bias that the warm-up leaves. */
export function predictionsOf(
  ground: Ground,
  averages: Readonly<Record<string, TimeAverage>>,
  run: {
    readonly replications: number
    readonly runLength: number
    readonly warmUp: number
    readonly confidence: number
  },
): Readonly<Record<string, Prediction>> {
  const { finite } = ground
  if (finite === undefined) return {}
  const { chain, structure } = finite
  const z = normalTailQuantile((1 - run.confidence) / 2)
  const startsSettled = structure.classOf[chain.start] >= 0
  const affordable = startsSettled && transientCost(chain, run.warmUp) <= mostMultiplications
  let atWarmUp: Float64Array | undefined
  if (affordable) {
    const from = new Float64Array(chain.size)
    from[chain.start] = 1
    atWarmUp = transientDistribution(chain, from, run.warmUp)
  }
  return Object.fromEntries(
    Object.entries(averages).map(([name, { varianceConstant, biasFrom, correlationTime }]) => {
      let bias: number | undefined
      if (atWarmUp !== undefined) {
        bias = 0
        for (let i = 0; i < chain.size; i++) bias += atWarmUp[i] * biasFrom[i]
        bias /= run.runLength
      }
      const halfWidth = z * Math.sqrt(varianceConstant / (run.replications * run.runLength))
      return [name, { halfWidth, correlationTime, ...(bias === undefined ? {} : { bias }) }]
    }),
  )
}
