import { fewestCorrelationTimes, type Prediction } from '../comparison/compare-measure.js'
import { type TimeAverage, timeAverage } from '../dynamics/time-average.js'
import { transientCost, transientDistribution } from '../dynamics/transient-distribution.js'
import { normalTailQuantile } from '../numbers/distributions.js'
import { pleasantAbove } from '../planning/run-length.js'
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
  // One slow part makes the whole run few looks at it: no measure can be called off for it.
  const slow = Object.values(averages).some(
    ({ correlationTime }) => correlationTime * fewestCorrelationTimes > run.runLength,
  )
  return Object.fromEntries(
    Object.entries(averages).map(([name, { varianceConstant, biasFrom, correlationTime }]) => {
      let bias: number | undefined
      if (atWarmUp !== undefined) {
        bias = 0
        for (let i = 0; i < chain.size; i++) bias += atWarmUp[i] * biasFrom[i]
        bias /= run.runLength
      }
      const halfWidth = z * Math.sqrt(varianceConstant / (run.replications * run.runLength))
      return [name, { halfWidth, correlationTime, slow, ...(bias === undefined ? {} : { bias }) }]
    }),
  )
}

/** The bias that is left may be this part at most of the half-width that the run will reach. */
const allowedBias = 1 / 40

/**
 * The smallest warm-up of pleasant numbers after which the exact bias of every mean is below a fortieth of the half-width
 * that the run will reach; undefined where it can't be known, or would take too long to work out.
 */
export function exactWarmUp(
  { finite }: Ground,
  averages: Readonly<Record<string, TimeAverage>>,
  run: {
    readonly replications: number
    readonly runLength: number
    readonly confidence: number
    readonly first: number
  },
): { readonly warmUp: number; readonly biasPart: number } | undefined {
  const known = Object.values(averages)
  if (finite === undefined || known.length === 0 || finite.structure.classOf[finite.chain.start] < 0) return undefined
  const { chain } = finite
  const z = normalTailQuantile((1 - run.confidence) / 2)
  let now: Float64Array = new Float64Array(chain.size)
  now[chain.start] = 1
  let warmUp = 0
  for (;;) {
    let worst = 0
    for (const { varianceConstant, biasFrom } of known) {
      let bias = 0
      for (let i = 0; i < chain.size; i++) bias += now[i] * biasFrom[i]
      const halfWidth = z * Math.sqrt(varianceConstant / (run.replications * run.runLength))
      if (halfWidth > 0) worst = Math.max(worst, Math.abs(bias) / run.runLength / halfWidth)
    }
    if (worst <= allowedBias) return { warmUp, biasPart: worst }
    const next = warmUp === 0 ? run.first : pleasantAbove(warmUp * 1.01)
    if (transientCost(chain, next - warmUp) > mostMultiplications / 4 || next > run.runLength) return undefined
    now = transientDistribution(chain, now, next - warmUp)
    warmUp = next
  }
}
