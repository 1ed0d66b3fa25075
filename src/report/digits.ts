/** Digits that a table shows of an exact value at most: more would not be read. */
const mostDigits = 6

/** An exact value: six significant digits, fewer where its error bound supports fewer. */
export function exactDigits(value: number, errorBound: number): string {
  if (!Number.isFinite(value)) return String(value)
  if (value === 0) return '0'
  // Known without any error: its zeros at the end tell nothing.
  if (errorBound === 0) return trimZeros(significant(value, mostDigits))
  const supported = errorBound > 0 ? Math.floor(Math.log10(Math.abs(value) / errorBound)) : mostDigits
  return significant(value, Math.max(1, Math.min(mostDigits, supported)))
}

/** An estimate to the second digit of its half-width, and the half-width with two digits: `0.1149 ± 0.0007`. */
export function estimateDigits(
  estimate: number,
  halfWidth: number | null,
): { readonly estimate: string; readonly halfWidth: string } {
  if (halfWidth === null || !Number.isFinite(halfWidth)) return { estimate: significant(estimate, 4), halfWidth: '' }
  if (halfWidth === 0) return { estimate: trimZeros(significant(estimate, mostDigits)), halfWidth: '0' }
  const place = Math.floor(Math.log10(halfWidth)) - 1
  // A half-width is told with one digit less where that is a round 1 or larger: two digits are what it supports.
  if (place < -12 || Math.abs(estimate) >= 1e15)
    return { estimate: significant(estimate, 6), halfWidth: significant(halfWidth, 2) }
  return { estimate: atPlace(estimate, place), halfWidth: atPlace(halfWidth, place) }
}

/** A share as a percentage with sensible digits: `0.2 %`, `12 %`. */
export function percentDigits(share: number): string {
  const percent = Math.abs(share) * 100
  if (percent === 0) return '0.0 %'
  if (percent < 0.05) return '0.0 %'
  if (percent >= 1e6) return 'over 10⁶ %'
  return `${percent < 10 ? Number(percent.toPrecision(percent < 1 ? 1 : 2)).toFixed(1) : percent.toFixed(0)} %`
}

/** So many significant digits, in plain notation where that is short. */
export function significant(value: number, digits: number): string {
  if (value === 0 || !Number.isFinite(value)) return String(value)
  const size = Math.abs(value)
  if (size >= 1e9 || size < 1e-6) {
    const [mantissa, exponent] = value.toExponential(digits - 1).split('e')
    return `${mantissa}e${Number(exponent)}`
  }
  const place = Math.floor(Math.log10(size)) - digits + 1
  return atPlace(value, place)
}

/** Rounded to a power of ten, with its trailing zeros: they are digits that are known. */
function atPlace(value: number, place: number): string {
  const rounded = place > 0 ? Math.round(value / 10 ** place) * 10 ** place : value
  return rounded.toLocaleString('en-US', {
    minimumFractionDigits: Math.max(0, Math.min(20, -place)),
    maximumFractionDigits: Math.max(0, Math.min(20, -place)),
    useGrouping: Math.abs(rounded) >= 10_000,
  })
}

/** A count in words that fit a line: `5.4 million`, `12,345`. */
export function countInWords(count: number): string {
  for (const [size, word] of [
    [1e12, 'trillion'],
    [1e9, 'billion'],
    [1e6, 'million'],
  ] as const) {
    if (count >= size) return `${significant(count / size, count / size < 10 ? 2 : 3)} ${word}`
  }
  return Math.round(count).toLocaleString('en-US')
}

/** A length of time in the scenario's unit: `1 hour`, `20,000 hours`. */
export function inUnits(value: number, unit: string): string {
  const number = Number.isInteger(value) ? value.toLocaleString('en-US') : trimZeros(significant(value, 3))
  return `${number} ${value === 1 || /s$/i.test(unit) ? unit : `${unit}s`}`
}

export const trimZeros = (text: string): string =>
  text.includes('.') && !text.includes('e') ? text.replace(/\.?0+$/, '') : text
