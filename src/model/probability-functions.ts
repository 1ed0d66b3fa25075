import { NoValue } from '../scenario/evaluate-exactly.js'

/** A value with a bound on its error. */
export interface BoundedNumber {
  readonly value: number
  readonly error: number
}

const u = 2 ** -53

/** Counts and means up to here are worked out term by term; a larger one would stall the program. */
const largest = 10_000_000

const check = (name: string, holds: boolean, what: string): void => {
  if (!holds) throw new NoValue(`"${name}" ${what}.`, 'Check its arguments.')
}

/** Values already worked out: rates ask for the same few again and again. Dropped when they are many. */
function remembered(make: (a: number, b: number, c: number, d: number) => BoundedNumber) {
  const known = new Map<string, BoundedNumber>()
  return (a: number, b: number, c: number, d = 0): BoundedNumber => {
    const key = `${a} ${b} ${c} ${d}`
    let found = known.get(key)
    if (found === undefined) {
      if (known.size > 100_000) known.clear()
      found = make(a, b, c, d)
      known.set(key, found)
    }
    return found
  }
}

/**
 * e^-m m^k / k!, as a product whose factors above and below 1 alternate, so that nothing over- or underflows before the
 * result does. Each factor is rounded once or twice, which the bound counts; an error of the mean counts |k/m - 1|.
 */
export const poisson = remembered((k, m, em) => {
  check('poisson', m >= 0 && m <= largest, `needs a mean from 0 to ${largest.toLocaleString('en-US')}`)
  if (k < 0) return { value: 0, error: 0 }
  if (m === 0) return { value: k === 0 ? 1 : 0, error: k <= 1 ? em : 0 }
  check('poisson', k <= largest, 'counts too far')
  const { value, roundings } = poissonProduct(k, m)
  return { value, error: bounded(value, roundings, Math.abs(k / m - 1) * em) }
})

function poissonProduct(k: number, m: number): { value: number; roundings: number } {
  let value = 1
  let left = m
  let roundings = 2
  for (let i = 1; i <= k; i++) {
    value *= m / i
    while (value > 1e100 && left > 0) {
      const part = Math.min(left, 100)
      value *= Math.exp(-part)
      left -= part
      roundings += 4
    }
  }
  while (left > 0) {
    const part = Math.min(left, 100)
    value *= Math.exp(-part)
    left -= part
    roundings += 4
  }
  return { value, roundings: roundings + 2 * k }
}

const bounded = (value: number, roundings: number, relative: number): number =>
  value * (roundings * u + relative) * (1 + 2 ** -20) + 5e-324

/** P(k or more). Above the mean added up from k on; below it, where it is near 1, as 1 less the few that are missing. */
export const poissonTail = remembered((k, m, em) => {
  check('poisson_tail', m >= 0 && m <= largest, `needs a mean from 0 to ${largest.toLocaleString('en-US')}`)
  if (k <= 0) return { value: 1, error: 0 }
  if (m === 0) return { value: 0, error: em }
  check('poisson_tail', k <= largest, 'counts too far')
  const before = poissonProduct(k - 1, m)
  const fromMean = before.value * em
  if (k > m) {
    let term = (before.value * m) / k
    let sum = 0
    let terms = 0
    for (let i = k + 1; term > sum * 1e-18 && term > 0; i++) {
      sum += term
      term *= m / i
      terms++
    }
    return { value: sum, error: bounded(sum, before.roundings + 3 * terms + 4, 0) + fromMean }
  }
  let term = before.value
  let sum = 0
  let terms = 0
  for (let i = k - 1; i >= 0 && term > sum * 1e-18; i--) {
    sum += term
    term *= i / m
    terms++
  }
  const value = 1 - sum
  return { value, error: bounded(sum, before.roundings + 3 * terms + 4, 0) + fromMean + u }
})

/** C(n, k) p^k (1-p)^(n-k), factors alternating as above; an error of p counts |k/p - (n-k)/(1-p)|. */
export const binomial = remembered((k, n, p, ep) => {
  checkBinomial('binomial', n, p)
  if (k < 0 || k > n) return { value: 0, error: 0 }
  const { value, roundings } = binomialProduct(k, n, p)
  return { value, error: bounded(value, roundings, binomialSlope(k, n, p) * ep) + (p === 0 || p === 1 ? n * ep : 0) }
})

function binomialSlope(k: number, n: number, p: number): number {
  return p === 0 || p === 1 ? 0 : Math.max(k / p, (n - k) / (1 - p))
}

function checkBinomial(name: string, n: number, p: number): void {
  check(name, n >= 0 && n <= largest, `needs a number of trials from 0 to ${largest.toLocaleString('en-US')}`)
  check(name, p >= 0 && p <= 1, 'needs a probability from 0 to 1')
}

function binomialProduct(k: number, n: number, p: number): { value: number; roundings: number } {
  const q = 1 - p
  let value = 1
  let ups = k
  let downs = n - k
  const least = Math.min(k, n - k)
  for (let i = 1; i <= least; i++) {
    value *= (n - least + i) / i
    while (value > 1e50 && (ups > 0 || downs > 0)) {
      if (ups > 0) {
        value *= p
        ups--
      }
      if (downs > 0) {
        value *= q
        downs--
      }
    }
  }
  // What is left of the powers: the larger base first would only delay, any order is as good now.
  while (ups > 0 || downs > 0) {
    if (ups > 0) {
      value *= p
      ups--
    }
    if (downs > 0) {
      value *= q
      downs--
    }
    if (value === 0) break
  }
  return { value, roundings: 2 * least + n + (n - k) + 2 }
}

export const binomialTail = remembered((k, n, p, ep) => {
  checkBinomial('binomial_tail', n, p)
  if (k <= 0) return { value: 1, error: 0 }
  if (k > n) return { value: 0, error: 0 }
  if (p === 0 || p === 1) return { value: p, error: n * ep }
  const first = binomialProduct(k, n, p)
  const slope = (k * first.value) / p // derivative of the tail: n C(n-1, k-1) p^(k-1) q^(n-k) = k C(n, k) p^(k-1) q^(n-k)
  const odds = p / (1 - p)
  if (k > n * p) {
    let term = first.value
    let sum = 0
    let terms = 0
    for (let i = k; i <= n && term > sum * 1e-18; i++) {
      sum += term
      term *= ((n - i) / (i + 1)) * odds
      terms++
    }
    return { value: sum, error: bounded(sum, first.roundings + 6 * terms + 4, 0) + slope * ep }
  }
  let term = (first.value * k) / (n - k + 1) / odds
  let sum = 0
  let terms = 0
  for (let i = k - 1; i >= 0 && term > sum * 1e-18; i--) {
    sum += term
    term *= i / (n - i + 1) / odds
    terms++
  }
  return { value: 1 - sum, error: bounded(sum, first.roundings + 8 * terms + 12, 0) + slope * ep + u }
})

/** p (1-p)^k: failures before the first success. */
export const geometric = remembered((k, p, ep) => {
  checkGeometric('geometric', p)
  if (k < 0) return { value: 0, error: 0 }
  const { value, error } = failures(k, p, ep)
  const product = p * value
  return { value: product, error: p * error + value * ep + product * u * 2 + 5e-324 }
})

export const geometricTail = remembered((k, p, ep) => {
  checkGeometric('geometric_tail', p)
  return k <= 0 ? { value: 1, error: 0 } : failures(k, p, ep)
})

function checkGeometric(name: string, p: number): void {
  check(name, p > 0 && p <= 1, 'needs a probability above 0 and up to 1')
}

/** (1-p)^k by repeated squaring: an error of the base counts k times. */
function failures(k: number, p: number, ep: number): BoundedNumber {
  const q = 1 - p
  let value = 1
  let base = q
  let steps = 0
  for (let rest = k; rest > 0; rest = Math.floor(rest / 2)) {
    if (rest % 2 === 1) value *= base
    base *= base
    steps += 2
  }
  const relative = q === 0 ? 0 : k * (u + ep / q + u * steps)
  return { value, error: value * relative * (1 + 2 ** -20) + (q === 0 ? ep : 0) + 5e-324 }
}
