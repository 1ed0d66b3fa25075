/** Digits that a table of several columns shows of an exact value at most: more would not be read. */
const mostDigits = 6

/** An exact value: so many significant digits at most, fewer where its error bound supports fewer. */
export function exactDigits(value: number, errorBound: number, most = mostDigits): string {
  if (!Number.isFinite(value)) return String(value)
  if (value === 0) return '0'
  // Known without any error: its zeros at the end tell nothing.
  if (errorBound === 0) return trimZeros(significant(value, most))
  const supported = Math.floor(Math.log10(Math.abs(value) / errorBound))
  return significant(value, Math.max(1, Math.min(most, supported)))
}

/** A bound on an error, rounded up: what is shown is a bound too. `2e-16`, `0`. */
export function boundDigits(errorBound: number): string {
  if (errorBound === 0 || !Number.isFinite(errorBound)) return String(errorBound)
  const [mantissa, exponent] = errorBound.toExponential(16).split('e')
  const up = Math.ceil(Number(mantissa))
  return up === 10 ? `1e${Number(exponent) + 1}` : `${up}e${Number(exponent)}`
}

/** An estimate to the second digit of its half-width, and the half-width with two digits: `0.11490 ± 0.00070`. */
export function estimateDigits(
  estimate: number,
  halfWidth: number | null,
): { readonly estimate: string; readonly halfWidth: string } {
  if (halfWidth === null || !Number.isFinite(halfWidth)) return { estimate: significant(estimate, 4), halfWidth: '' }
  if (halfWidth === 0) return { estimate: trimZeros(significant(estimate, mostDigits)), halfWidth: '0' }
  const place = Math.floor(Math.log10(halfWidth)) - 1
  const size = Math.abs(estimate)
  if (place < -12 || size >= 1e9 || (size > 0 && size < 1e-6)) {
    const digits = size === 0 ? 1 : Math.floor(Math.log10(size)) - place + 1
    return {
      estimate: significant(estimate, Math.max(1, Math.min(15, digits))),
      halfWidth: significant(halfWidth, 2),
    }
  }
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
export const inUnits = (value: number, unit: string): string =>
  `${amount(value)} ${value === 1 || /s$/i.test(unit) ? unit : `${unit}s`}`

/** A setting as a sentence tells it: whole numbers whole, others with up to four digits. */
export const amount = (value: number): string =>
  Number.isInteger(value) && Math.abs(value) < 1e15
    ? value.toLocaleString('en-US', { useGrouping: Math.abs(value) >= 10_000 })
    : trimZeros(significant(value, 4))

export const trimZeros = (text: string): string =>
  text.includes('.') && !text.includes('e') ? text.replace(/\.?0+$/, '') : text
