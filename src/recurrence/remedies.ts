import { StillmarkError } from '../errors/stillmark-error.js'
import { compile } from '../model/compile.js'
import type { VariablesModel } from '../model/model.js'
import {
  add,
  compare,
  divide,
  type Fraction,
  fraction,
  multiply,
  one,
  subtract,
  toNumber,
  zero,
} from '../numbers/fraction.js'
import type { Classification, Remedy } from './classification.js'
import { simplestBetween } from './simplest-fraction.js'

/** Factors by which a constant is moved, nearest first, until the model has a steady state. */
const factors: readonly Fraction[] = [
  [1_000_001, 1_000_000], [21, 20], [5, 4], [3, 2], [2, 1], [4, 1], [16, 1], [256, 1],
].map(([top, bottom]) => fraction(top, bottom)) // biome-ignore format: pairs

/** Width of the last interval, relative, and steps of bisection that reach it. */
const bisections = 44
/** Time that the search may take in all, in decisions. */
const mostDecisions = 1500

/**
 * For each constant the nearest value at which the model gets a steady state, the others as they are. Each side was
 * decided by proof. Exact where the simplest fraction between the two sides is itself decided not to be steady while
 * its neighbours at a relative distance of 1e-60 are on their sides.
 *
 * @param decide the proof, without remedies
 */
export function remediesOf(model: VariablesModel, decide: (model: VariablesModel) => Classification): Remedy[] {
  let decisions = 0
  const steadyAt = (name: string, value: Fraction): boolean | undefined => {
    if (++decisions > mostDecisions) return undefined
    try {
      const found = decide(withConstant(model, name, value))
      if (found.recurrence === 'positive recurrent') return found.grade === 'proved' ? true : undefined
      return found.grade === 'proved' || found.noSteadyState === true ? false : undefined
    } catch (error) {
      if (error instanceof StillmarkError) return undefined
      throw error
    }
  }
  const remedies: Remedy[] = []
  for (const [name, value] of model.scenario.constants) {
    if (!('numerator' in value) || !usedInMoves(model, name)) continue
    const own = nearest(value, (at) => steadyAt(name, at))
    if (own !== undefined) remedies.push({ constant: name, now: toNumber(value), ...own })
  }
  return remedies
}

function nearest(
  now: Fraction,
  steadyAt: (value: Fraction) => boolean | undefined,
): Omit<Remedy, 'constant' | 'now'> | undefined {
  let last = now
  let lastAbove = now
  for (const factor of factors) {
    const candidates = now.numerator === 0n ? [subtract(factor, one)] : [divide(now, factor), multiply(now, factor)]
    for (const candidate of candidates) {
      if (steadyAt(candidate) !== true) continue
      const up = compare(candidate, now) > 0
      const from = up ? lastAbove : last
      return between(from, candidate, steadyAt)
    }
    ;[last, lastAbove] = now.numerator === 0n ? [now, candidates[0]] : [candidates[0], candidates[1]]
  }
  return undefined
}

/** Bisection on the proof between a value without and one with a steady state. */
function between(
  unsteady: Fraction,
  steady: Fraction,
  steadyAt: (value: Fraction) => boolean | undefined,
): Omit<Remedy, 'constant' | 'now'> | undefined {
  const steadyWhen = compare(steady, unsteady) < 0 ? 'below' : 'above'
  let [bad, good] = [unsteady, steady]
  if (steadyAt(bad) !== false) return undefined
  for (let k = 0; k < bisections; k++) {
    // At exact balance the threshold is where the model stands; else the simplest fraction between the two sides is often it.
    for (const guess of k === 0
      ? [unsteady, simplestBetween(bad, good)]
      : k % 6 === 0
        ? [simplestBetween(bad, good)]
        : []) {
      const near = fraction(1n, 10n ** 60n)
      const scale = guess.numerator === 0n ? one : guess.numerator < 0n ? subtract(zero, guess) : guess
      const offset = multiply(scale, near)
      const inner = steadyWhen === 'below' ? subtract(guess, offset) : add(guess, offset)
      const outer = steadyWhen === 'below' ? add(guess, offset) : subtract(guess, offset)
      if (steadyAt(guess) === false && steadyAt(inner) === true && steadyAt(outer) === false) {
        return { threshold: toNumber(guess), exact: guess, steadyWhen }
      }
    }
    const middle = shortened(divide(add(bad, good), fraction(2)))
    const found = steadyAt(middle)
    if (found === undefined) return undefined
    if (found) good = middle
    else bad = middle
  }
  return { threshold: toNumber(divide(add(bad, good), fraction(2))), steadyWhen }
}

/** A fraction near one with long digits, so that bisection doesn't make the proofs slow. */
const shortened = (value: Fraction): Fraction => {
  const bits = 60n
  return value.denominator < 1n << bits ? value : fraction((value.numerator << bits) / value.denominator, 1n << bits)
}

function withConstant(model: VariablesModel, name: string, value: Fraction): VariablesModel {
  const { scenario } = model
  const changed = compile({
    ...scenario,
    measures: [],
    claims: [],
    constants: new Map(scenario.constants).set(name, value),
  })
  if (changed.kind !== 'variables') throw new Error('a model by variables became a table')
  return changed
}

/** Whether a constant occurs in what moves the model: the measures alone can't change its class. */
function usedInMoves(model: VariablesModel, name: string): boolean {
  const { body, quantities } = model.scenario
  if (body.kind !== 'variables') return false
  const text = JSON.stringify(
    [body.transitions.map(({ when, rate, then, each }) => [when, rate, then, each]), [...quantities]],
    (_, value) => (typeof value === 'bigint' ? `${value}` : value),
  )
  return (
    text.includes(`"kind":"constant","name":${JSON.stringify(name)}`) ||
    new RegExp(`"name":${JSON.stringify(name)}[^{}]*"kind":"constant"`).test(text)
  )
}
