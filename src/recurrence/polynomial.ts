import { add, type Fraction, fraction, multiply, negate, one, sign, zero } from '../numbers/fraction.js'

/**
 * A polynomial in the counts n₀, n₁, … with exact coefficients: exponents joined by commas → coefficient, none of them 0.
 * The empty map is the polynomial 0.
 */
export type Polynomial = ReadonlyMap<string, Fraction>

/** Highest total degree that is followed: beyond it a model is no queue, and the arithmetic would only take time. */
export const highestDegree = 24

export const constantPolynomial = (value: Fraction, symbols: number): Polynomial =>
  value.numerator === 0n ? new Map() : new Map([[constantKey(symbols), value]])

const constantKey = (symbols: number): string => new Array(symbols).fill(0).join(',')

/** The count n_k itself. */
export const symbol = (k: number, symbols: number): Polynomial =>
  new Map([[Array.from({ length: symbols }, (_, i) => (i === k ? 1 : 0)).join(','), one]])

export function addPolynomials(a: Polynomial, b: Polynomial): Polynomial {
  if (a.size === 0) return b
  if (b.size === 0) return a
  const sum = new Map(a)
  for (const [key, value] of b) {
    const total = add(sum.get(key) ?? zero, value)
    if (total.numerator === 0n) sum.delete(key)
    else sum.set(key, total)
  }
  return sum
}

export const negatePolynomial = (a: Polynomial): Polynomial =>
  new Map([...a].map(([key, value]) => [key, negate(value)] as const))

export const scalePolynomial = (a: Polynomial, factor: Fraction): Polynomial =>
  factor.numerator === 0n ? new Map() : new Map([...a].map(([key, value]) => [key, multiply(value, factor)] as const))

export function multiplyPolynomials(a: Polynomial, b: Polynomial): Polynomial {
  const product = new Map<string, Fraction>()
  for (const [keyA, valueA] of a) {
    const exponentsA = exponentsOf(keyA)
    for (const [keyB, valueB] of b) {
      const key = exponentsOf(keyB)
        .map((exponent, i) => exponent + exponentsA[i])
        .join(',')
      product.set(key, add(product.get(key) ?? zero, multiply(valueA, valueB)))
    }
  }
  for (const [key, value] of product) if (value.numerator === 0n) product.delete(key)
  return product
}

export const exponentsOf = (key: string): number[] => (key === '' ? [] : key.split(',').map(Number))

/** Total degree; -1 of the polynomial 0. */
export const degreeOf = (a: Polynomial): number =>
  Math.max(-1, ...[...a.keys()].map((key) => exponentsOf(key).reduce((sum, each) => sum + each, 0)))

/** The value where the polynomial doesn't depend on any count. */
export function constantOf(a: Polynomial): Fraction | undefined {
  if (a.size === 0) return zero
  if (a.size > 1) return undefined
  const [[key, value]] = a
  return exponentsOf(key).every((each) => each === 0) ? value : undefined
}

/** Which counts occur. */
export function symbolsIn(a: Polynomial): Set<number> {
  const found = new Set<number>()
  for (const key of a.keys()) {
    exponentsOf(key).forEach((exponent, k) => {
      if (exponent > 0) found.add(k)
    })
  }
  return found
}

/** Coefficients of a polynomial in one count, from the constant up; empty for 0. */
export function coefficientsOf(a: Polynomial): Fraction[] {
  const degree = degreeOf(a)
  return Array.from({ length: degree + 1 }, (_, k) => a.get(`${k}`) ?? zero)
}

export const polynomialOf = (coefficients: readonly Fraction[]): Polynomial =>
  new Map(coefficients.map((value, k) => [`${k}`, value] as const).filter(([, value]) => value.numerator !== 0n))

/** The same polynomial of counts that start `by` further: p(n + by) in every count. */
export function shiftPolynomial(a: Polynomial, by: bigint): Polynomial {
  let shifted: Polynomial = new Map()
  for (const [key, value] of a) {
    const exponents = exponentsOf(key)
    let term: Polynomial = new Map([[exponents.map(() => 0).join(','), value]])
    exponents.forEach((exponent, k) => {
      if (exponent === 0) return
      const power = new Map<string, Fraction>()
      let binomial = 1n
      for (let j = 0; j <= exponent; j++) {
        const coefficient = fraction(binomial * by ** BigInt(exponent - j))
        if (coefficient.numerator !== 0n) power.set(exponents.map((_, i) => (i === k ? j : 0)).join(','), coefficient)
        binomial = (binomial * BigInt(exponent - j)) / BigInt(j + 1)
      }
      term = multiplyPolynomials(term, power)
    })
    shifted = addPolynomials(shifted, term)
  }
  return shifted
}

/** Furthest level looked at for the point from which a polynomial keeps its sign. */
export const furthestLevel = 1 << 20

/**
 * The sign that the polynomial has wherever every count is at least `level`, with the smallest such level (at least
 * 0) that shows it: all coefficients of p(n + level) have one sign and the constant one is not 0. In one count there
 * is always such a level (Gauss and Lucas: it lies above the real parts of all roots); in several there need not be.
 *
 * @returns undefined where no level up to `furthestLevel` shows a sign
 */
export function signBeyond(a: Polynomial): { readonly sign: -1 | 0 | 1; readonly level: number } | undefined {
  const constant = constantOf(a)
  if (constant !== undefined) return { sign: sign(constant), level: Number.NEGATIVE_INFINITY }
  let high = 0
  let found = uniformSign(a, high)
  if (found !== 0) return { sign: found, level: 0 }
  for (high = 1; found === 0; high *= 2) {
    if (high > furthestLevel) return undefined
    found = uniformSign(a, high)
    if (found !== 0) break
  }
  let low = high >> 1 // shows no sign, `high` does; once shown a sign stays
  while (high - low > 1) {
    const middle = (low + high) >> 1
    if (uniformSign(a, middle) === 0) low = middle
    else high = middle
  }
  return { sign: found, level: high }
}

function uniformSign(a: Polynomial, level: number): -1 | 0 | 1 {
  const shifted = shiftPolynomial(a, BigInt(level))
  let all: -1 | 0 | 1 = 0
  let constantSeen = false
  for (const [key, value] of shifted) {
    const own = sign(value)
    if (all === 0) all = own
    if (own !== all) return 0
    if (exponentsOf(key).every((each) => each === 0)) constantSeen = true
  }
  return constantSeen ? all : 0
}

export function evaluatePolynomial(a: Polynomial, at: readonly bigint[]): Fraction {
  let total = zero
  for (const [key, value] of a) {
    const factor = exponentsOf(key).reduce((product, exponent, k) => product * at[k] ** BigInt(exponent), 1n)
    total = add(total, multiply(value, fraction(factor)))
  }
  return total
}
