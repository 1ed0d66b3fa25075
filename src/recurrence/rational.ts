import { divide, type Fraction, isInteger, multiply, one, power, subtract, zero } from '../numbers/fraction.js'
import type { RationalFunction } from './classification.js'
import {
  addPolynomials,
  coefficientsOf,
  constantOf,
  constantPolynomial,
  degreeOf,
  evaluatePolynomial,
  highestDegree,
  multiplyPolynomials,
  negatePolynomial,
  type Polynomial,
  scalePolynomial,
  signBeyond,
} from './polynomial.js'

/** A quotient of polynomials in the counts, where the denominator is not 0 far out. */
export interface Rational {
  readonly top: Polynomial
  readonly bottom: Polynomial
}

/** What reading gives up on; `why` completes "… can't be followed since". */
export class NotFollowed extends Error {
  constructor(readonly why: string) {
    super(why)
  }
}

export const rationalOf = (value: Fraction, symbols: number): Rational => ({
  top: constantPolynomial(value, symbols),
  bottom: constantPolynomial(one, symbols),
})

/** The value where it doesn't depend on any count. */
export function constantIn(a: Rational): Fraction | undefined {
  const bottom = constantOf(a.bottom)
  if (bottom === undefined) return a.top.size === 0 ? zero : ratioOf(a)
  const top = constantOf(a.top)
  return top === undefined ? undefined : divide(top, bottom)
}

/** top = c × bottom, such as (2n + 2)/(n + 1). */
function ratioOf({ top, bottom }: Rational): Fraction | undefined {
  if (top.size !== bottom.size) return undefined
  const [[key, value]] = bottom
  const own = top.get(key)
  if (own === undefined) return undefined
  const ratio = divide(own, value)
  return addPolynomials(top, negatePolynomial(scalePolynomial(bottom, ratio))).size === 0 ? ratio : undefined
}

export function addRationals(a: Rational, b: Rational): Rational {
  if (samePolynomial(a.bottom, b.bottom)) return tidy({ top: addPolynomials(a.top, b.top), bottom: a.bottom })
  return tidy({
    top: addPolynomials(multiplyPolynomials(a.top, b.bottom), multiplyPolynomials(b.top, a.bottom)),
    bottom: multiplyPolynomials(a.bottom, b.bottom),
  })
}

export const negateRational = (a: Rational): Rational => ({ top: negatePolynomial(a.top), bottom: a.bottom })
export const subtractRationals = (a: Rational, b: Rational): Rational => addRationals(a, negateRational(b))

export const multiplyRationals = (a: Rational, b: Rational): Rational =>
  tidy({ top: multiplyPolynomials(a.top, b.top), bottom: multiplyPolynomials(a.bottom, b.bottom) })

/** @throws NotFollowed where b is 0 */
export function divideRationals(a: Rational, b: Rational): Rational {
  if (b.top.size === 0) throw new NotFollowed('something is divided by 0')
  return tidy({ top: multiplyPolynomials(a.top, b.bottom), bottom: multiplyPolynomials(a.bottom, b.top) })
}

export function powerOfRational(a: Rational, exponent: Fraction, symbols: number): Rational {
  if (!isInteger(exponent)) throw new NotFollowed('a power has a broken exponent')
  const times = Number(exponent.numerator)
  const constant = constantIn(a)
  if (constant !== undefined) {
    if (Math.abs(times) > 4096) throw new NotFollowed('a power is too high')
    if (constant.numerator === 0n && times < 0) throw new NotFollowed('something is divided by 0')
    return rationalOf(power(constant, times), symbols)
  }
  if (Math.abs(times) > highestDegree) throw new NotFollowed('a power is too high')
  let result = rationalOf(one, symbols)
  for (let k = 0; k < Math.abs(times); k++) result = multiplyRationals(result, a)
  return times < 0 ? divideRationals(rationalOf(one, symbols), result) : result
}

/** Divides constants out, so that constants compare as constants, and refuses degrees beyond `highestDegree`. */
function tidy(a: Rational): Rational {
  const bottom = constantOf(a.bottom)
  if (bottom !== undefined) {
    if (bottom.numerator === 1n && bottom.denominator === 1n) return limited(a)
    const [key] = a.bottom.keys()
    return limited({ top: scalePolynomial(a.top, divide(one, bottom)), bottom: new Map([[key, one]]) })
  }
  const value = constantIn(a)
  if (value === undefined) return limited(a)
  const [key] = a.bottom.keys()
  const symbols = key.split(',').length
  return rationalOf(value, symbols)
}

function limited(a: Rational): Rational {
  if (degreeOf(a.top) > highestDegree || degreeOf(a.bottom) > highestDegree) {
    throw new NotFollowed('an expression has too high a degree in the unbounded variables')
  }
  return a
}

export function samePolynomial(a: Polynomial, b: Polynomial): boolean {
  return a === b || (a.size === b.size && addPolynomials(a, negatePolynomial(b)).size === 0)
}

export const sameRational = (a: Rational, b: Rational): boolean =>
  samePolynomial(multiplyPolynomials(a.top, b.bottom), multiplyPolynomials(b.top, a.bottom))

/** Sign far out, with the level from which it holds. */
export function rationalSign(a: Rational): { readonly sign: -1 | 0 | 1; readonly level: number } | undefined {
  const top = signBeyond(a.top)
  const bottom = signBeyond(a.bottom)
  if (top === undefined || bottom === undefined) return undefined
  return { sign: (top.sign * bottom.sign) as -1 | 0 | 1, level: Math.max(top.level, bottom.level) }
}

/** Of one count: degree of the top minus that of the bottom; -Infinity of 0. */
export const orderOf = (a: Rational): number =>
  a.top.size === 0 ? Number.NEGATIVE_INFINITY : degreeOf(a.top) - degreeOf(a.bottom)

/**
 * Of one count: the coefficients of n^order, n^(order-1), … of the expansion for large n, `terms` of them.
 */
export function expansionOf(a: Rational, order: number, terms: number): Fraction[] {
  const top = coefficientsOf(a.top).reverse()
  const bottom = coefficientsOf(a.bottom).reverse()
  const own = orderOf(a)
  const series: Fraction[] = []
  if (a.top.size === 0) return new Array<Fraction>(terms).fill(zero)
  const lead = bottom[0]
  for (let k = 0; k < terms + Math.max(0, own - order); k++) {
    let rest = top[k] ?? zero
    for (let j = 1; j <= k && j < bottom.length; j++) rest = minusProduct(rest, bottom[j], series[k - j])
    series.push(divide(rest, lead))
  }
  const skipped = order - own
  return skipped >= 0
    ? [...new Array<Fraction>(skipped).fill(zero), ...series].slice(0, terms)
    : series.slice(-skipped, -skipped + terms)
}

const minusProduct = (a: Fraction, b: Fraction, c: Fraction): Fraction => subtract(a, multiply(b, c))

export const evaluateRational = (a: Rational, at: readonly bigint[]): Fraction =>
  divide(evaluatePolynomial(a.top, at), evaluatePolynomial(a.bottom, at))

/** As it is handed to solvers. */
export const rationalFunction = (a: Rational): RationalFunction => ({
  numerator: coefficientsOf(a.top),
  denominator: coefficientsOf(a.bottom),
})
