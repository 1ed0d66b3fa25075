import { InvalidArgumentError } from 'commander'
import { compare, one, sign, toNumber } from '../numbers/fraction.js'
import { warmUpRules } from '../scenario/warm-up-rules.js'
import { writtenNumber } from '../scenario/written-number.js'

// Each function reads the text behind one option. What it can't use it refuses in two short sentences: what is wrong
// is said by commander ("option … argument … is invalid."), what is allowed by the message here.

const refuse = (allowed: string): never => {
  throw new InvalidArgumentError(allowed)
}

function plainNumber(text: string): number {
  const written = writtenNumber(text)
  return written === undefined || written.percent ? Number.NaN : toNumber(written.value)
}

const wholeNumber =
  (most: number, what: string) =>
  (text: string): number => {
    const value = plainNumber(text)
    return Number.isInteger(value) && value >= 1 && value <= most
      ? value
      : refuse(`${what}: a whole number from 1 to ${most.toLocaleString('en-US')}.`)
  }

export const replications = wholeNumber(1e6, 'The number of runs')
export const workers = wholeNumber(1024, 'The number of threads')
/** States are numbered by 32-bit integers. */
export const maxStates = wholeNumber(2 ** 31 - 1, 'The most states that are listed')

export function runLength(text: string): number {
  const value = plainNumber(text)
  return value > 0 && Number.isFinite(value) ? value : refuse('A number of time units above 0.')
}

export function warmUp(text: string): number | string {
  const value = plainNumber(text)
  if (value >= 0 && Number.isFinite(value)) return value
  if ((warmUpRules as readonly string[]).includes(text)) return text
  return refuse(`A number of time units of 0 or more, or one of ${warmUpRules.join(', ')}.`)
}

export function confidence(text: string): number {
  const written = writtenNumber(text)
  if (written === undefined) return refuse('A share between 0 and 1: 0.95 or 95%.')
  if (sign(written.value) > 0 && compare(written.value, one) < 0) return toNumber(written.value)
  const percent = toNumber(written.value)
  return refuse(
    !written.percent && percent > 1 && percent < 100
      ? `It lies between 0 and 1. Did you mean ${text.trim()}%?`
      : 'It lies between 0 and 1: 0.95 or 95%.',
  )
}

/** A percentage is relative, a plain number absolute. */
export function tolerance(text: string): { kind: 'absolute' | 'relative'; value: number } {
  const written = writtenNumber(text)
  if (written === undefined || sign(written.value) <= 0)
    return refuse('Write 2% (of the exact value), or a number above 0 in the unit of the measures.')
  return { kind: written.percent ? 'relative' : 'absolute', value: toNumber(written.value) }
}

/** A seed is a phrase: any text but none at all. */
export const seed = (text: string): string =>
  text.trim() === '' ? refuse('A phrase of at least one character.') : text

/** `name=value`, gathered over all its uses; the scenario reader judges name and value. */
export function setConstant(text: string, before: ReadonlyMap<string, string> | undefined): Map<string, string> {
  const [, name, value] = /^\s*([^=\s]+)\s*=\s*(\S.*?)\s*$/.exec(text) ?? []
  if (name === undefined) return refuse('Write it as name=value: --set doors=30.')
  if (before?.has(name)) return refuse(`"${name}" is set twice.`)
  return new Map([...(before ?? []), [name, value]])
}

const bytesOf: Readonly<Record<string, number>> = {
  kb: 1e3,
  mb: 1e6,
  gb: 1e9,
  tb: 1e12,
  kib: 2 ** 10,
  mib: 2 ** 20,
  gib: 2 ** 30,
  tib: 2 ** 40,
}

/** `4GB`, `512 MiB`. @returns bytes */
export function memory(text: string): number {
  const [, number = '', unit = ''] = /^\s*([\d.eE+]+)\s*([a-zA-Z]+)\s*$/.exec(text) ?? []
  const bytes = plainNumber(number) * (bytesOf[unit.toLowerCase()] ?? Number.NaN)
  return bytes >= 1 && Number.isFinite(bytes) ? Math.floor(bytes) : refuse('A size with its unit: 4GB, 512MB, 2GiB.')
}

const secondsOf: Readonly<Record<string, number>> = { s: 1, sec: 1, min: 60, h: 3600 }

/** Longest delay that Node's timers can hold, in seconds. */
const longestTimer = (2 ** 31 - 1) / 1000

/** `90s`, `10min`, `2h`. @returns seconds */
export function duration(text: string): number {
  const [, number = '', unit = ''] = /^\s*([\d.eE+]+)\s*([a-z]+)\s*$/.exec(text) ?? []
  const seconds = plainNumber(number) * (secondsOf[unit] ?? Number.NaN)
  return seconds > 0 && seconds <= longestTimer ? seconds : refuse('A time with its unit: 90s, 10min, 2h (up to 596h).')
}
