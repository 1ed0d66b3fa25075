import { newMoves } from '../model/compile.js'
import type { VariablesModel } from '../model/model.js'
import { add, equal, type Fraction, fraction, isInteger, one, subtract, toNumber, zero } from '../numbers/fraction.js'
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
import { bodyOf, type Expression, elementOf, holds, type Reach, type Reading, type Rule, read } from './reading.js'

/** One copy of a transition with the values of its `each` names. */
export interface Copy {
  readonly label: number
  readonly rule: Rule
  readonly bound: ReadonlyMap<string, Fraction>
  /** Shared by all copies of a model: whether anything that was read is approximate. */
  readonly notes: { approximate: boolean }
}

/** Every copy of every transition, as the model numbers them. */
export function copiesOf(model: VariablesModel): Copy[] {
  const rules = new Map(bodyOf(model).transitions.map((rule) => [rule.name, rule] as const))
  const notes = { approximate: false }
  return model.labels.map(({ transition, copy }, label) => {
    const rule = rules.get(transition)
    if (rule === undefined) throw new NotFollowed(`"${transition}" is not known`)
    return { label, rule, notes, bound: new Map(rule.each.map(({ name }, k) => [name, fraction(copy[k])] as const)) }
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
  /** Some rate has no exact fraction and was taken as the nearest double: nothing is proved by it. */
  readonly approximate: boolean
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
  const reach: Reach = { level: Number.NEGATIVE_INFINITY, approximate: false }
  const base = { model, symbols, elements, modulus: BigInt(place.modulus), residue: BigInt(place.residue), reach }
  const moves: FarMove[] = []
  let total = rationalOf(zero, symbols)
  for (const { label, rule, bound, notes } of copies) {
    const reading: Reading = { ...base, bound }
    const enabled = holds(read(rule.when, reading), reading)
    if (reach.approximate) notes.approximate = true
    if (!enabled) continue
    const rate = read(rule.rate, reading)
    if (reach.approximate) notes.approximate = true
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
      return { moves: moves.map((move) => ({ ...move, rate: divideRationals(move.rate, all) })), ...reach }
    }
  }
  return { moves, ...reach }
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
 * Holds what was read against the model's own moves in one state: the same targets with the same rates, exactly; to
 * 1e-9 of the rate where what was read is approximate.
 * @returns false where they differ
 */
export function agreesAt(model: VariablesModel, place: Place, far: FarMoves, counts: readonly number[]): boolean {
  const here = stateOf(place, counts)
  const key = here.join(' ')
  const own = new Map<string, Fraction>()
  let largest = 0
  for (const { rate, next } of model.expandExactly(here)) {
    if (rate === undefined) return far.approximate && agreesRoughly(model, place, far, counts)
    largest = Math.max(largest, toNumber(rate))
    if (next.join(' ') !== key) own.set(next.join(' '), add(own.get(next.join(' ')) ?? zero, rate))
  }
  for (const [target, rate] of movesRead(place, far, counts)) {
    own.set(target, subtract(own.get(target) ?? zero, rate))
  }
  return nothingLeft(
    far,
    [...own.values()].map((rest) => (rest.numerator === 0n ? 0 : toNumber(rest))),
    far.approximate ? 1e-9 * largest : 0,
  )
}

function movesRead(place: Place, far: FarMoves, counts: readonly number[]): [string, Fraction][] {
  const at = counts.map(BigInt)
  return far.moves.flatMap((move) => {
    const { jump } = move
    if (jump === undefined) return []
    const next = stateOf(
      { ...place, values: move.values },
      counts.map((count, k) => count + jump[k]),
    )
    return [[next.join(' '), evaluateRational(move.rate, at)]]
  })
}

function agreesRoughly(model: VariablesModel, place: Place, far: FarMoves, counts: readonly number[]): boolean {
  const here = stateOf(place, counts)
  const own = new Map<string, number>()
  const moves = newMoves(model.width)
  model.expand(here, moves)
  let largest = 0
  for (let k = 0; k < moves.count; k++) {
    const target = Array.from(moves.next.subarray(k * model.width, (k + 1) * model.width)).join(' ')
    largest = Math.max(largest, moves.rate[k])
    if (target !== here.join(' ')) own.set(target, (own.get(target) ?? 0) + moves.rate[k])
  }
  for (const [target, rate] of movesRead(place, far, counts)) own.set(target, (own.get(target) ?? 0) - toNumber(rate))
  return nothingLeft(far, [...own.values()], 1e-9 * largest)
}

/** What resets a count is left over: it was read as positive, its target was not. */
function nothingLeft(far: FarMoves, rests: readonly number[], tolerance: number): boolean {
  const resets = far.moves.filter((move) => move.jump === undefined).length
  const left = rests.filter((rest) => Math.abs(rest) > tolerance)
  return resets === 0 ? left.length === 0 : left.length <= resets && left.every((rest) => rest > 0)
}
