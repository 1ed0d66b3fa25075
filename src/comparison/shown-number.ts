/** A number in a sentence: four significant digits, no exponent where it can be avoided. */
export function shown(value: number, digits = 4): string {
  if (!Number.isFinite(value)) return String(value)
  if (value === 0) return '0'
  const size = Math.abs(value)
  if (size >= 1e7 || size < 1e-5) return value.toExponential(digits - 1).replace(/\.?0+e/, 'e')
  const rounded = Number(value.toPrecision(digits))
  return size >= 10_000 ? Math.round(value).toLocaleString('en-US') : String(rounded)
}

export const percent = (share: number): string => `${shown(100 * share, 3)} %`

/** "hour" → "hours" for any number but 1. */
export function inUnits(value: number, unit: string): string {
  const plural = Math.abs(value) === 1 || /s$/.test(unit) ? unit : `${unit}s`
  return `${shown(value)} ${plural}`
}
