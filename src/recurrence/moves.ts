import type { VariablesModel } from '../model/model.js'
import { add, equal, type Fraction, fraction, isInteger, one, toNumber, zero } from '../numbers/fraction.js'
import { constantPolynomial, type Polynomial, scalePolynomial, symbol } from './polynomial.js'
import {
  addRationals,
  constantIn,
  divideRationals,
  evaluateRational,
  NotFollowed,
  type Rational,
  rationalOf,
  rationalSign,
  subtractRationals,
} from './rational.js'
import { bodyOf, type Expression, elementOf, holds, type Reading, type Rule, read } from './reading.js'

/** One copy of a transition with the values of its `each` names. */
export interface Copy {
  readonly label: number
  readonly rule: Rule
  readonly bound: ReadonlyMap<string, Fraction>
}

/** Every copy of every transition, as the model numbers them. */
export function copiesOf(model: VariablesModel): Copy[] {
  const rules = new Map(bodyOf(model).transitions.map((rule) => [rule.name, rule] as const))
  return model.labels.map(({ transition, copy }, label) => {
    const rule = rules.get(transition)
    if (rule === undefined) throw new NotFollowed(`"${transition}" is not known`)
    return { label, rule, bound: new Map(rule.each.map(({ name }, k) => [name, fraction(copy[k])] as const)) }
  })
}

/** Where a state lies far out: which elements are counts, and the values of the others. */
export interface Place {
  /** Elements that are large, in the order of the symbols. */
  readonly counts: readonly number[]
  /** Of each count: 1 where the element is n, -1 where it is -n. */
  readonly outward: readonly (1 | -1)[]
  /** Values of all elements; those of the counts mean nothing. */
  readonly values: readonly number[]
  /** Of a single count: n ≡ residue modulo modulus. */
  readonly modulus: number
  readonly residue: number
}

/** What a transition does far out. */
export interface FarMove {
  readonly label: number
  /** Function of the counts, positive far out. */
  readonly rate: Rational
  /** Gain of each count (outward); undefined where the move resets a count. */
  readonly jump?: readonly number[]
  /** Values of the other elements afterwards, as `Place.values`; counts hold 0. */
  readonly values: readonly number[]
}

/** What was read, and the level from which on it holds for every count. */
export interface FarMoves {
  readonly moves: readonly FarMove[]
  /** -Infinity where nothing depends on any count but through rates as they stand. */
  readonly level: number
}

/**
 * All moves out of the states of a place, beyond a level. Moves with rate 0 and moves that leave the state as it is are left out;
 * in discrete time the probabilities are normalised as the model does.
 * @throws NotFollowed, NeedsModulus
 */
export function movesAt(model: VariablesModel, copies: readonly Copy[], place: Place): FarMoves {
  const symbols = place.counts.length
  const elements: Rational[] = place.values.map((value) => rationalOf(fraction(value), symbols))
  const unit = constantPolynomial(one, symbols)
  place.counts.forEach((element, k) => {
    const count: Polynomial = symbol(k, symbols)
    elements[element] = { top: place.outward[k] === 1 ? count : scalePolynomial(count, fraction(-1)), bottom: unit }
  })
  const reach = { level: Number.NEGATIVE_INFINITY }
  const base = { model, symbols, elements, modulus: BigInt(place.modulus), residue: BigInt(place.residue), reach }
  const moves: FarMove[] = []
  let total = rationalOf(zero, symbols)
  for (const { label, rule, bound } of copies) {
    const reading: Reading = { ...base, bound }
    if (!holds(read(rule.when, reading), reading)) continue
    const rate = read(rule.rate, reading)
    const sign = rationalSign(rate)
    if (sign === undefined) throw new NotFollowed(`the sign of the rate of "${rule.name}" is not settled far out`)
    reach.level = Math.max(reach.level, sign.level)
    if (sign.sign === 0) continue
    if (sign.sign < 0) throw new NotFollowed(`the rate of "${rule.name}" is negative far out`)
    total = addRationals(total, rate)
    const after = targetOf(rule, reading, place)
    if (after.jump?.every((each) => each === 0) && after.values.every((value, i) => value === valueBefore(place, i))) {
      continue
    }
    moves.push({ label, rate, ...after })
  }
  if (model.time === 'discrete' && bodyOf(model).remainder === 'refuse') {
    const sum = constantIn(total)
    if (sum === undefined || Math.abs(toNumber(sum) - 1) > 1e-9) {
      throw new NotFollowed('the probabilities do not sum to 1 far out')
    }
    if (!equal(sum, one)) {
      const all = rationalOf(sum, symbols)
      return { moves: moves.map((move) => ({ ...move, rate: divideRationals(move.rate, all) })), level: reach.level }
    }
  }
  return { moves, level: reach.level }
}

const valueBefore = (place: Place, element: number): number =>
  place.counts.includes(element) ? 0 : place.values[element]

function targetOf(rule: Rule, reading: Reading, place: Place): Pick<FarMove, 'jump' | 'values'> {
  const values = place.values.map((_, element) => valueBefore(place, element))
  const jump = place.counts.map(() => 0)
  let resets = false
  for (const { variable, index, value } of rule.then) {
    const element = elementOf({ name: variable, index: index as Expression | undefined }, reading)
    const next = read(value, reading)
    const k = place.counts.indexOf(element)
    if (k === -1) {
      values[element] = wholeNumber(constantIn(next), variable)
      continue
    }
    if (constantIn(next) !== undefined) {
      resets = true // to a value: how far it falls depends on where it is
      continue
    }
    const gain = constantIn(subtractRationals(next, reading.elements[element]))
    if (gain === undefined) throw new NotFollowed(`"${variable}" moves by an amount that grows with the state`)
    jump[k] = wholeNumber(gain, variable) * place.outward[k]
  }
  return resets ? { values } : { jump, values }
}

function wholeNumber(value: Fraction | undefined, variable: string): number {
  if (value === undefined) throw new NotFollowed(`"${variable}" takes the value of an unbounded variable`)
  if (!isInteger(value)) throw new NotFollowed(`"${variable}" takes a broken value`)
  return Number(value.numerator)
}

/** The state vector of a place at given counts. */
export function stateOf(place: Place, counts: readonly number[]): number[] {
  const state = [...place.values]
  place.counts.forEach((element, k) => {
    state[element] = place.outward[k] * counts[k]
  })
  return state
}

/**
 * Holds what was read against the model's own exact moves in one state: the same targets with the same rates.
 * @returns false where they differ, or where the model's rate is not known exactly
 */
export function agreesAt(model: VariablesModel, place: Place, far: FarMoves, counts: readonly number[]): boolean {
  const here = stateOf(place, counts)
  const key = here.join(' ')
  const own = new Map<string, Fraction>()
  for (const { rate, next } of model.expandExactly(here)) {
    if (rate === undefined) return false
    if (next.join(' ') !== key) own.set(next.join(' '), add(own.get(next.join(' ')) ?? zero, rate))
  }
  const at = counts.map(BigInt)
  for (const move of far.moves) {
    if (move.jump === undefined) continue
    const next = stateOf(
      { ...place, values: move.values },
      counts.map((count, k) => count + (move.jump as number[])[k]),
    )
    const rate = evaluateRational(move.rate, at)
    const rest = add(own.get(next.join(' ')) ?? zero, { numerator: -rate.numerator, denominator: rate.denominator })
    own.set(next.join(' '), rest)
  }
  // What resets a count is left over: it was read as positive, its target was not.
  const resets = far.moves.filter((move) => move.jump === undefined).length
  const left = [...own.values()].filter((rest) => rest.numerator !== 0n)
  return resets === 0 ? left.length === 0 : left.length <= resets && left.every((rest) => rest.numerator > 0n)
}
