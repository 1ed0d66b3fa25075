import type { Chain } from '../chain/chain.js'
import type { Reward } from '../stationary/measure-rewards.js'
import type { SolvedClass } from '../stationary/solved-class.js'
import { relativeValues } from './relative-values.js'
import { varianceConstant } from './variance-constant.js'

/** How the time average of one measure behaves on one closed class. */
export interface TimeAverage {
  /** Limit of T · Var(time average over T). */
  readonly varianceConstant: number
  /** Limit of T · (E[time average over T from each state] - long-run value), length n of the whole chain, 0 off the class. */
  readonly biasFrom: Float64Array
  /** ∫ of the autocorrelation function over positive times, in time units; 0 where the state's part does not vary. */
  readonly correlationTime: number
}

export function timeAverage(chain: Chain, solved: SolvedClass, { perTime, perFiring }: Reward): TimeAverage {
  const { states } = solved.chain
  const own = relativeValues(solved, perTime)
  const biasFrom = new Float64Array(chain.size)
  const shares = new Float64Array(chain.size)
  let mean = 0
  for (let k = 0; k < states.length; k++) {
    biasFrom[states[k]] = own[k]
    shares[states[k]] = solved.share[k]
    mean += solved.share[k] * perTime[k]
  }
  let variance = 0
  for (let k = 0; k < states.length; k++) variance += solved.share[k] * (perTime[k] - mean) ** 2
  const smooth = varianceConstant(chain, shares, biasFrom)
  return {
    varianceConstant: perFiring === undefined ? smooth : varianceConstant(chain, shares, biasFrom, perFiring),
    biasFrom,
    correlationTime: variance > 1e-24 * mean * mean && variance > 0 ? smooth / (2 * variance) : 0,
  }
}
