/** An exact rational: denominator positive, in lowest terms. Plain data, so that it survives a structured clone. */
export interface Fraction {
  readonly numerator: bigint
  readonly denominator: bigint
}

export const zero: Fraction = { numerator: 0n, denominator: 1n }
export const one: Fraction = { numerator: 1n, denominator: 1n }

/** @throws RangeError where the denominator is 0 */
export function fraction(numerator: bigint | number, denominator: bigint | number = 1n): Fraction {
  const n = BigInt(numerator)
  const d = BigInt(denominator)
  if (d === 0n) throw new RangeError('a fraction with denominator 0')
  const common = greatestCommonDivisor(n < 0n ? -n : n, d < 0n ? -d : d)
  const unit = d < 0n ? -common : common
  return { numerator: n / unit, denominator: d / unit }
}

/** The double as it is, exactly. @throws RangeError for NaN and infinities */
export function fractionOfDouble(value: number): Fraction {
  if (!Number.isFinite(value)) throw new RangeError(`${value} is not a number that a fraction can hold`)
  if (Number.isInteger(value)) return { numerator: BigInt(value), denominator: 1n }
  let denominator = 1n
  let scaled = value
  while (!Number.isInteger(scaled)) {
    scaled *= 2 ** 52 // exact: a power of two, and what overflows was an integer before
    denominator <<= 52n
  }
  return fraction(BigInt(scaled), denominator)
}

/** Largest power of ten that a written number may carry: beyond it a double can't follow anyway. */
export const largestWrittenExponent = 400

/**
 * A written number: `12`, `-0.5`, `1e-9`, `1/3`, `2.5/7`. Exact, whatever its length.
 * @returns undefined where the text is no such number, its denominator is 0, or its exponent is beyond 400
 */
export function fractionOfText(text: string): Fraction | undefined {
  const parts = text.trim().split('/')
  if (parts.length > 2) return undefined
  const [top, bottom] = parts.map((part) => decimal(part.trim()))
  if (top === undefined) return undefined
  if (parts.length === 1) return top
  if (bottom === undefined || bottom.numerator === 0n) return undefined
  return divide(top, bottom)
}

function decimal(text: string): Fraction | undefined {
  const match = /^([+-]?)(\d*)(?:\.(\d*))?(?:[eE]([+-]?\d+))?$/.exec(text)
  if (match === null) return undefined
  const [, sign, whole, decimals = '', exponent = '0'] = match
  if (whole === '' && decimals === '') return undefined
  const power = Number(exponent)
  if (Math.abs(power) > largestWrittenExponent || whole.length + decimals.length > 10_000) return undefined
  const digits = BigInt(whole + decimals) * (sign === '-' ? -1n : 1n)
  const shift = power - decimals.length
  return shift >= 0 ? fraction(digits * 10n ** BigInt(shift)) : fraction(digits, 10n ** BigInt(-shift))
}

export const add = (a: Fraction, b: Fraction): Fraction =>
  fraction(a.numerator * b.denominator + b.numerator * a.denominator, a.denominator * b.denominator)
export const subtract = (a: Fraction, b: Fraction): Fraction =>
  fraction(a.numerator * b.denominator - b.numerator * a.denominator, a.denominator * b.denominator)
export const multiply = (a: Fraction, b: Fraction): Fraction =>
  fraction(a.numerator * b.numerator, a.denominator * b.denominator)
/** @throws RangeError where b is 0 */
export const divide = (a: Fraction, b: Fraction): Fraction =>
  fraction(a.numerator * b.denominator, a.denominator * b.numerator)
export const negate = (a: Fraction): Fraction => ({ numerator: -a.numerator, denominator: a.denominator })
export const absolute = (a: Fraction): Fraction => (a.numerator < 0n ? negate(a) : a)
export const sign = (a: Fraction): -1 | 0 | 1 => (a.numerator > 0n ? 1 : a.numerator < 0n ? -1 : 0)
export const compare = (a: Fraction, b: Fraction): -1 | 0 | 1 => {
  const difference = a.numerator * b.denominator - b.numerator * a.denominator
  return difference > 0n ? 1 : difference < 0n ? -1 : 0
}
export const equal = (a: Fraction, b: Fraction): boolean =>
  a.numerator === b.numerator && a.denominator === b.denominator
export const isInteger = (a: Fraction): boolean => a.denominator === 1n

/** Largest integer not above a. */
export function floor(a: Fraction): bigint {
  const quotient = a.numerator / a.denominator
  return a.numerator < 0n && a.numerator % a.denominator !== 0n ? quotient - 1n : quotient
}

/** @throws RangeError for 0 to a negative power */
export function power(a: Fraction, exponent: number): Fraction {
  const up = BigInt(Math.abs(exponent))
  return exponent >= 0
    ? { numerator: a.numerator ** up, denominator: a.denominator ** up }
    : fraction(a.denominator ** up, a.numerator ** up)
}

/** The nearest double, ties to even; 0 or ±Infinity beyond a double's range. */
export function toNumber(a: Fraction): number {
  const negative = a.numerator < 0n
  const n = negative ? -a.numerator : a.numerator
  const d = a.denominator
  if (n === 0n) return 0
  // Scale the quotient to 64 bits or more, keep whether anything was cut off as the lowest bit, then round once.
  let shift = bitLength(d) - bitLength(n) + 66
  // Below 2⁻¹⁰²² a double has fewer bits: cut so that the final scaling is exact and rounds only here.
  shift = Math.min(shift, 1074)
  const scaledTop = shift >= 0 ? n << BigInt(shift) : n
  const scaledBottom = shift >= 0 ? d : d << BigInt(-shift)
  let quotient = scaledTop / scaledBottom
  const rest = scaledTop % scaledBottom !== 0n
  const extra = bitLength(quotient) - 53
  if (extra > 0) {
    const half = 1n << BigInt(extra - 1)
    const low = quotient & ((1n << BigInt(extra)) - 1n)
    quotient >>= BigInt(extra)
    if (low > half || (low === half && (rest || (quotient & 1n) === 1n))) quotient += 1n
    shift -= extra
  } else if (rest) {
    const twice = (scaledTop % scaledBottom) * 2n
    if (twice > scaledBottom || (twice === scaledBottom && (quotient & 1n) === 1n)) quotient += 1n
  }
  const magnitude = timesPowerOfTwo(Number(quotient), -shift)
  return negative ? -magnitude : magnitude
}

/** Exact as long as the result is a double: in two halves, since 2^-1074 · 2^53 does not fit one power. */
function timesPowerOfTwo(value: number, exponent: number): number {
  const half = Math.trunc(exponent / 2)
  return value * 2 ** half * 2 ** (exponent - half)
}

const bitLength = (value: bigint): number => {
  const hex = value.toString(16)
  return value === 0n ? 0 : (hex.length - 1) * 4 + (32 - Math.clz32(Number.parseInt(hex[0], 16)))
}

function greatestCommonDivisor(a: bigint, b: bigint): bigint {
  let x = a
  let y = b
  while (y !== 0n) [x, y] = [y, x % y]
  return x === 0n ? 1n : x
}

/** `1/3`, `-7`. */
export const toText = (a: Fraction): string =>
  a.denominator === 1n ? `${a.numerator}` : `${a.numerator}/${a.denominator}`
