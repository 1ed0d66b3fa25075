import type { VariablesModel } from '../model/model.js'
import { add, divide, equal, type Fraction, multiply, one, subtract, toNumber, zero } from '../numbers/fraction.js'
import { driftFarOut } from './birth-death-series.js'
import type { Classification, Prediction } from './classification.js'
import { countOf, type Ground, type MetClass } from './end-pattern.js'
import { constantIn, expansionOf, orderOf } from './rational.js'

/**
 * How a model without a steady state moves away: laws that follow from what was checked, none where none is sure.
 */
export function growthOf(
  model: VariablesModel,
  ground: Ground,
  met: readonly MetClass[],
  recurrence: Classification['recurrence'],
  explosive: boolean,
): Prediction[] {
  if (explosive || (recurrence !== 'transient' && recurrence !== 'null recurrent')) return []
  const name = model.elements[ground.ends[0].end.element]
  const wanted = recurrence === 'transient' ? 'escapes' : 'late'
  const moving = met.filter(({ own }) => own.closed && own.fate === wanted)
  if (moving.length !== 1) return []
  const [{ at, own }] = moving
  const outward = at.end.outward
  const predictions: Prediction[] = []
  const { birthDeath } = own
  if (own.drift !== undefined && own.drift.value > 0) {
    predictions.push({
      name: `speed_${name}`,
      value: outward * own.drift.value,
      ...(own.drift.exact === undefined ? {} : { exact: withSign(own.drift.exact, outward) }),
      means: `limit of ${name}(t) / t`,
      source: own.theorem.startsWith('counters')
        ? 'the law of large numbers for additive functionals (Chung 1967, I.15, from memory)'
        : own.theorem,
    })
  } else if (birthDeath !== undefined) {
    predictions.push(...birthDeathGrowth(name, outward, birthDeath))
  } else if (own.diffusion !== undefined && ground.ends.length === 1) {
    const law = besselGrowth(name, outward, own.diffusion.variance, own.diffusion.weight)
    if (law !== undefined) predictions.push(law)
  }
  const returns = recurrence === 'transient' ? returnsOf(model, ground, own.drift?.exact) : undefined
  if (returns !== undefined) predictions.push(returns)
  return predictions
}

const withSign = (value: Fraction, outward: 1 | -1): Fraction =>
  outward === 1 ? value : { numerator: -value.numerator, denominator: value.denominator }

function birthDeathGrowth(
  name: string,
  outward: 1 | -1,
  rates: NonNullable<MetClass['own']['birthDeath']>,
): Prediction[] {
  const { birth, death } = rates
  const order = Math.max(orderOf(birth), orderOf(death))
  const { limit } = driftFarOut(birth, death)
  if (limit === undefined || order > 1) return []
  if (limit.numerator > 0n) {
    // The mean's derivative is the mean of the drift; the process leaves every finite set, where alone the drift differs.
    const path = order <= 0
    return [
      {
        name: `speed_${name}`,
        value: outward * toNumber(limit),
        exact: withSign(limit, outward),
        ...(path ? {} : { inMean: true as const }),
        means: path ? `limit of ${name}(t) / t` : `limit of the mean of ${name}(t) / t`,
        source: path ? 'the law of large numbers (Lamperti 1963, from memory)' : 'Karlin and McGregor 1958',
      },
    ]
  }
  if (order !== 0 || limit.numerator !== 0n) return []
  const [up, upSlope] = expansionOf(birth, 0, 2)
  const [down, downSlope] = expansionOf(death, 0, 2)
  const variance = add(up, down)
  const weight = divide(multiply({ numerator: 2n, denominator: 1n }, subtract(upSlope, downSlope)), variance)
  const law = besselGrowth(name, outward, toNumber(variance), weight)
  return law === undefined ? [] : [law]
}

/**
 * Drift w·σ²/(2n) at variance σ²: the count over √t tends to a Bessel process of dimension 1 + w (Lamperti 1962), whose
 * mean at time 1 is √(2σ²) Γ((2 + w)/2)/Γ((1 + w)/2). With w = 0 it is Brownian motion reflected: √(2σ²/π).
 */
function besselGrowth(name: string, outward: 1 | -1, variance: number, weight: Fraction): Prediction | undefined {
  const dimension = 1 + toNumber(weight)
  if (!(dimension > 0)) return undefined
  const value = outward * Math.sqrt(2 * variance) * Math.exp(logGamma((dimension + 1) / 2) - logGamma(dimension / 2))
  return {
    name: `growth_${name}`,
    value,
    means: `limit of the mean of ${name}(t) / √t`,
    source:
      weight.numerator === 0n
        ? 'Brownian motion reflected (Harrison 1985, from memory)'
        : 'Lamperti 1962 (from memory)',
  }
}

/** log Γ for positive arguments: Stirling's series from 15 on, carried down by Γ(x + 1) = xΓ(x). Relative error below 1e-14. */
function logGamma(x: number): number {
  let shift = 0
  let at = x
  for (; at < 15; at++) shift += Math.log(at)
  const square = 1 / (at * at)
  const series = (1 / 12 - square * (1 / 360 - square * (1 / 1260 - square * (1 / 1680 - square / 1188)))) / at
  return (at - 0.5) * Math.log(at) - at + 0.5 * Math.log(2 * Math.PI) + series - shift
}

/**
 * Expected number of returns to the start of a transient birth-death process with constant rates far out: one over
 * the probability of never coming back, less one (Karlin and McGregor 1957).
 */
function returnsOf(model: VariablesModel, ground: Ground, drift: Fraction | undefined): Prediction | undefined {
  const { exploration, ends } = ground
  if (ends.length !== 1 || drift === undefined) return undefined
  const [{ end, met }] = ends
  const start = exploration.states[0]
  const sameElsewhere = exploration.states.every((state) =>
    state.every((value, k) => k === end.element || value === start[k]),
  )
  if (!sameElsewhere || met.size !== 1 || end.modulus !== 1) return undefined
  const rates = (count: number): { up: Fraction; down: Fraction; stay: Fraction } | undefined => {
    const state = [...start]
    state[end.element] = count * end.outward
    let [up, down, stay] = [zero, zero, zero]
    for (const { rate, next } of model.expandExactly(state)) {
      if (rate === undefined) return undefined
      const gain = countOf(end, next) - count
      if (gain === 1) up = add(up, rate)
      else if (gain === -1) down = add(down, rate)
      else if (gain === 0) stay = add(stay, rate)
      else return undefined
    }
    return { up, down, stay }
  }
  const first = countOf(end, start)
  const here = rates(first)
  if (here === undefined || here.up.numerator === 0n) return undefined
  // Below the start it must be certain to come back up.
  for (let count = first - 1; ; count--) {
    const below = [...start]
    below[end.element] = count * end.outward
    if (!exploration.indexOf.has(below.join(' '))) break
    const own = rates(count)
    if (own === undefined || own.up.numerator === 0n) return undefined
  }
  let sum = one
  let term = one
  for (let count = first + 1; ; count++) {
    const own = rates(count)
    if (own === undefined || own.up.numerator === 0n) return undefined
    const ratio = divide(own.down, own.up)
    if (count >= end.level) {
      // From here on a geometric series.
      if (constantIn(end.arcs[0][0].rate) === undefined || ratio.numerator >= ratio.denominator) return undefined
      sum = add(sum, divide(multiply(term, ratio), subtract(one, ratio)))
      break
    }
    term = multiply(term, ratio)
    sum = add(sum, term)
  }
  const staying = model.time === 'discrete' ? here.stay : zero
  const leaving = model.time === 'discrete' ? one : add(here.up, here.down)
  if (model.time === 'discrete' && !equal(add(add(here.up, here.down), staying), one) && here.stay.numerator !== 0n)
    return undefined
  const never = divide(divide(here.up, leaving), sum)
  const value = subtract(divide(one, never), one)
  return {
    name: 'returns',
    value: toNumber(value),
    exact: value,
    means: 'expected number of returns to the start',
    source: 'Karlin and McGregor 1957',
  }
}
