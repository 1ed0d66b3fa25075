import { StillmarkError } from '../errors/stillmark-error.js'
import { productError, sumError } from '../numbers/double-double.js'
import {
  compare,
  divide,
  type Fraction,
  fraction,
  fractionOfDouble,
  multiply,
  one,
  toNumber,
  zero,
} from '../numbers/fraction.js'
import type { BirthDeath, RationalFunction } from '../recurrence/classification.js'
import {
  addPolynomials,
  degreeOf,
  multiplyPolynomials,
  negatePolynomial,
  type Polynomial,
  polynomialOf,
  shiftPolynomial,
  signBeyond,
} from '../recurrence/polynomial.js'
import { type Growth, growthAt } from './solve-unbounded-growth.js'

/** Long-run shares of the counts first, first + 1, …, and what is known of those beyond. */
export interface CountShares {
  readonly first: number
  /** Share of time at count first + k; those below 1e-270 of the largest come out as 0. */
  readonly share: Float64Array
  /** Bound on the relative error of each share that is not 0, against the numbers as written. */
  readonly relativeError: number
  /** Beyond the last count each share is at most this part of the one before. Below 1. */
  readonly ratio: number
  /** Bound on what each share that came out as 0 may be. */
  readonly vanished: number
}

/** More counts than this are not added up. */
const mostCounts = 3_000_000

/** What lies beyond the last count is to weigh less than this part of the whole. */
const beyondLast = 1e-45

/** Values are kept within 2^±this of 1, the rest of their size in an exponent of its own. */
const kept = 300

/**
 * Long-run shares of a birth-death process by detailed balance: p(n + 1) = p(n) · birth(n) / death(n + 1). The ratios are
 * taken from exact fractions, their products in doubled precision, so that each share is right but for its last rounding.
 *
 * Beyond the last count the shares fall at least like a geometric series. Its ratio is proved: where the ratio of
 * neighbours only falls, it is the last one computed, where it only rises, its limit; the sign of the difference of two
 * neighbouring ratios is that of a polynomial, which keeps it beyond a level that is found in exact arithmetic.
 *
 * Source: Feller 1968, XVII.7 (detailed balance).
 *
 * @param growth what will be averaged grows like this: the sum is carried until that is negligible beyond
 * @throws tail-too-heavy (limit) where the shares fall too slowly for a geometric bound, or more than 3 million counts are needed
 */
export function birthDeathShares(process: BirthDeath, growth: Growth): CountShares {
  const { first, beyond } = process
  const tail = ratioBeyond(process)
  const high: number[] = [1]
  const low: number[] = [0]
  const exponent: number[] = [0]
  let largest = 0
  const repeated = isConstant(process.birth) && isConstant(process.death)
  let [ratioHigh, ratioLow] = [0, 0]
  for (let n = first; ; n++) {
    if (n - first >= mostCounts) throw tooHeavy(tail.limit)
    const k = n - first
    // What is left beyond n, were n the last count.
    const ratio = n >= tail.from ? (tail.falling ? upward(ratioHigh) : tail.limit) : 1
    if (k > 0 && n > Math.max(tail.from, beyond) && ratio < 1) {
      const weight = Math.log(Math.abs(high[k])) + (exponent[k] - largest) * Math.LN2
      const factor = Math.log(growthAt(growth, Math.max(1, n)) + 1) - Math.log1p(-ratio)
      const slowed = ratio * (1 + 1 / Math.max(1, n)) ** growth.length
      if (slowed < 1 && weight + factor - Math.log1p(-slowed) < Math.log(beyondLast)) {
        return normalised(first, high, low, exponent, largest, ratio)
      }
    }
    if (!repeated || n <= beyond) {
      const exact = divide(birthAt(process, n), deathAt(process, n + 1))
      ;[ratioHigh, ratioLow] = doubled(exact)
    }
    let nextHigh = high[k] * ratioHigh
    let nextLow = productError(high[k], ratioHigh, nextHigh) + (high[k] * ratioLow + low[k] * ratioHigh)
    const sum = nextHigh + nextLow
    nextLow = sumError(nextHigh, nextLow, sum)
    nextHigh = sum
    let shift = 0
    if (nextHigh > 2 ** kept) shift = -kept
    else if (nextHigh < 2 ** -kept) shift = kept
    high.push(nextHigh * 2 ** shift)
    low.push(nextLow * 2 ** shift)
    exponent.push(exponent[k] - shift)
    const size = exponent[k] - shift + Math.log2(nextHigh * 2 ** shift)
    if (size > largest) largest = size
  }
}

/** Bound on Σ p(n) P(s) beyond the last count, s the larger of n and `outside`. */
export function tailOf({ first, share, ratio }: CountShares, growth: Growth, outside = 1): number {
  const last = first + share.length - 1
  const from = Math.max(1, last, outside)
  // P(s + j) ≤ P(s) (1 + 1/s)^(degree · j).
  const slowed = ratio * (1 + 1 / from) ** (growth.length - 1) * (1 + 2 ** -40)
  if (!(slowed < 1)) return Number.POSITIVE_INFINITY
  const lastShare = Math.max(share[share.length - 1], 1e-270)
  return ((lastShare * growthAt(growth, from) * slowed) / (1 - slowed)) * (1 + 2 ** -30)
}

function normalised(
  first: number,
  high: readonly number[],
  low: readonly number[],
  exponent: readonly number[],
  largest: number,
  ratio: number,
): CountShares {
  const top = Math.ceil(largest)
  const size = high.length
  const scaled = (value: number, k: number): number => {
    const power = exponent[k] - top
    return power < -900 - kept ? 0 : value * 2 ** Math.max(power, -600) * 2 ** Math.min(0, power + 600)
  }
  // The smallest first, in doubled precision.
  const order = Array.from({ length: size }, (_, k) => k).sort((a, b) => scaled(high[a], a) - scaled(high[b], b))
  let total = 0
  let rest = 0
  for (const k of order) {
    const term = scaled(high[k], k)
    const next = total + term
    rest += sumError(total, term, next) + scaled(low[k], k)
    total = next
  }
  const whole = total + rest
  const missed = rest - (whole - total)
  const share = new Float64Array(size)
  for (let k = 0; k < size; k++) {
    const value = scaled(high[k], k)
    const quotient = value / whole
    // One correction by the remainder: the quotient of the doubled numbers, rounded once.
    const product = quotient * whole
    const remainder = value - product - productError(quotient, whole, product) + (scaled(low[k], k) - quotient * missed)
    const exact = quotient + remainder / whole
    share[k] = exact < 1e-270 ? 0 : exact
  }
  // One rounding of each share; products, sum and what lies beyond the last count are far below it.
  return { first, share, ratio, relativeError: 2 ** -53 * (1 + 2 ** -20) + size * 2 ** -95, vanished: 2e-270 }
}

/** What ratios birth(n) / death(n + 1) do from a count on. */
interface RatioBeyond {
  readonly from: number
  /** They never grow from there on, so the one met is the largest; else the limit is. */
  readonly falling: boolean
  /** Rounded up. */
  readonly limit: number
}

function ratioBeyond({ birth, death, beyond, first }: BirthDeath): RatioBeyond {
  const above = (f: readonly Fraction[]): Polynomial => shiftPolynomial(polynomialOf(f), 1n)
  const top = multiplyPolynomials(polynomialOf(birth.numerator), above(death.denominator))
  const bottom = multiplyPolynomials(polynomialOf(birth.denominator), above(death.numerator))
  const difference = addPolynomials(
    multiplyPolynomials(shiftPolynomial(top, 1n), bottom),
    negatePolynomial(multiplyPolynomials(top, shiftPolynomial(bottom, 1n))),
  )
  const start = Math.max(beyond, first)
  const below = signBeyond(bottom)
  const degrees = degreeOf(top) - degreeOf(bottom)
  const exactLimit = degrees < 0 ? zero : degrees > 0 ? undefined : divide(leading(top), leading(bottom))
  const limit = exactLimit === undefined ? Number.POSITIVE_INFINITY : upward(toNumber(exactLimit))
  if (exactLimit === undefined || compare(exactLimit, one) >= 0 || below === undefined || below.sign === 0)
    throw tooHeavy(limit)
  if (difference.size === 0) return { from: Math.max(start, below.level), falling: false, limit }
  const changes = signBeyond(difference)
  if (changes === undefined) throw tooHeavy(limit)
  return { from: Math.max(start, below.level, changes.level) + 1, falling: changes.sign < 0, limit }
}

function leading(a: Polynomial): Fraction {
  const degree = degreeOf(a)
  return a.get(String(degree)) ?? zero
}

const isConstant = ({ numerator, denominator }: RationalFunction): boolean =>
  numerator.length <= 1 && denominator.length <= 1

export const birthAt = ({ birthBelow, beyond, first, birth }: BirthDeath, n: number): Fraction =>
  n < beyond ? (birthBelow[n - first] ?? zero) : rationalAt(birth, n)

export const deathAt = ({ deathBelow, beyond, first, death }: BirthDeath, n: number): Fraction =>
  n < beyond ? (deathBelow[n - first] ?? zero) : rationalAt(death, n)

function rationalAt({ numerator, denominator }: RationalFunction, n: number): Fraction {
  return divide(polynomialAt(numerator, n), polynomialAt(denominator, n))
}

function polynomialAt(coefficients: readonly Fraction[], n: number): Fraction {
  let value = zero
  const at = BigInt(n)
  for (let k = coefficients.length - 1; k >= 0; k--) {
    const { numerator, denominator } = coefficients[k]
    // Unreduced on purpose until the end: reducing costs more than it saves.
    value = {
      numerator: value.numerator * at * denominator + numerator * value.denominator,
      denominator: value.denominator * denominator,
    }
  }
  return fraction(value.numerator, value.denominator)
}

/** The fraction as the unevaluated sum of two doubles. */
export function doubled(value: Fraction): [number, number] {
  const high = toNumber(value)
  const exact = fractionOfDouble(high)
  const rest = {
    numerator: value.numerator * exact.denominator - exact.numerator * value.denominator,
    denominator: value.denominator * exact.denominator,
  }
  return [high, toNumber(rest)]
}

const upward = (value: number): number => value * (1 + 2 ** -50)

/** The share of the lowest count as a multiple of any other, exact: for tests and small cases. */
export const ratioOfCounts = (process: BirthDeath, from: number, to: number): Fraction => {
  let ratio = one
  for (let n = from; n < to; n++) ratio = multiply(ratio, divide(birthAt(process, n), deathAt(process, n + 1)))
  return ratio
}

const tooHeavy = (ratio: number) =>
  new StillmarkError(
    {
      code: 'tail-too-heavy',
      what: `The shares of large counts fall too slowly to be added up${Number.isFinite(ratio) ? ` (each is about ${ratio.toPrecision(6)} of the one before)` : ''}.`,
      next: 'Bring the model further from balance, or give the variable an upper bound.',
    },
    'limit',
  )
