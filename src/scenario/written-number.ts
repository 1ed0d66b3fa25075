import { divide, type Fraction, fraction, fractionOfText, one } from '../numbers/fraction.js'

/** A number as a file writes it. */
export interface WrittenNumber {
  readonly value: Fraction
  /** Written with a percent sign. */
  readonly percent: boolean
  /** Written as a fraction, 1/3: meant exactly, not rounded. */
  readonly asFraction: boolean
  /** One unit of the last written digit; 0 for a fraction, which has none. */
  readonly lastDigit: Fraction
}

const hundred = fraction(100)

/** `12`, `0.5`, `1e-3`, `1/3`, `2.5 %`; undefined for anything else. */
export function writtenNumber(text: string): WrittenNumber | undefined {
  const trimmed = text.trim()
  const percent = trimmed.endsWith('%')
  const bare = percent ? trimmed.slice(0, -1).trim() : trimmed
  const value = fractionOfText(bare)
  if (value === undefined) return undefined
  const asFraction = bare.includes('/')
  const [, decimals = '', exponent = '0'] = /^[^.eE]*(?:\.(\d*))?(?:[eE]([+-]?\d+))?$/.exec(bare) ?? []
  const power = Number(exponent) - decimals.length
  const digit = asFraction
    ? { numerator: 0n, denominator: 1n }
    : power >= 0
      ? fraction(10n ** BigInt(power))
      : fraction(1n, 10n ** BigInt(-power))
  const unit = percent ? divide(one, hundred) : one
  return {
    value: percent ? divide(value, hundred) : value,
    percent,
    asFraction,
    lastDigit: fraction(digit.numerator * unit.numerator, digit.denominator * unit.denominator),
  }
}
