import { compare, divide, type Fraction, fraction, one, sign, subtract, zero } from '../numbers/fraction.js'
import { shiftPolynomial } from './polynomial.js'
import { divideRationals, expansionOf, orderOf, type Rational } from './rational.js'

/** What the series of Karlin and McGregor say of a birth-death process far out. */
export interface BirthDeathVerdict {
  readonly recurrence: 'positive recurrent' | 'null recurrent' | 'transient'
  /** Continuous time: infinitely many events in finite time have a positive probability. */
  readonly explosive: boolean
  /** Birth rate over the next death rate tends to this; undefined where it grows without bound. */
  readonly limit: Fraction | undefined
  /** Where the limit is 1: the ratio is 1 + exponent/n + …, so that the weights go like n^exponent. */
  readonly exponent?: Fraction
}

/**
 * Class of a birth-death process on 0, 1, 2, … by its rates far out.
 *
 * Source: Karlin and McGregor 1957 (recurrent if and only if Σ 1/(λₙπₙ) diverges, then positive if and only if
 * Σ πₙ converges; πₙ = λ₀…λₙ₋₁/(μ₁…μₙ)). For rational rates the ratio of two terms is 1 + a/n + O(1/n²) or tends to
 * another limit, so Gauss's test decides: Σ converges if and only if the limit is below 1, or is 1 with a < -1.
 * Explosion: Reuter 1957, Σ (1/(λₙπₙ)) Σ_{k≤n} πₖ converges. Statements from memory.
 *
 * @param birth λ(n) and `death` μ(n): positive far out
 */
export function birthDeathVerdict(
  birth: Rational,
  death: Rational,
  time: 'continuous' | 'discrete',
): BirthDeathVerdict {
  // πₙ₊₁/πₙ = λ(n)/μ(n + 1)
  const next: Rational = { top: shiftPolynomial(death.top, 1n), bottom: shiftPolynomial(death.bottom, 1n) }
  const ratio = divideRationals(birth, next)
  const order = orderOf(ratio)
  const [limit, slope] = order > 0 ? [undefined, zero] : expansionOf(ratio, 0, 2)
  const against = limit === undefined ? 1 : compare(limit, one)
  const exponent = against === 0 ? divide(slope, one) : undefined
  // Terms 1/(λₙπₙ): the ratio of the next to this one is λ(n)/λ(n+1) × μ(n+1)/λ(n) = μ(n+1)/λ(n+1).
  const escapeTerms = expandedRatio(divideRationals(death, birth))
  const recurrent = !converges(escapeTerms)
  const weightsConverge = against < 0 || (exponent !== undefined && compare(exponent, fraction(-1)) < 0)
  const recurrence = recurrent ? (weightsConverge ? 'positive recurrent' : 'null recurrent') : 'transient'
  return {
    recurrence,
    explosive: time === 'continuous' && !recurrent && explodes(birth, against, weightsConverge),
    limit,
    ...(exponent === undefined ? {} : { exponent }),
  }
}

type Ratio = { readonly limit: Fraction | undefined; readonly slope: Fraction }

function expandedRatio(ratio: Rational): Ratio {
  if (orderOf(ratio) > 0) return { limit: undefined, slope: zero }
  const [limit, slope] = expansionOf(ratio, 0, 2)
  return { limit, slope }
}

/** Gauss's test for a series of positive terms. */
function converges({ limit, slope }: Ratio): boolean {
  if (limit === undefined) return false
  const order = compare(limit, one)
  return order < 0 || (order === 0 && compare(slope, fraction(-1)) < 0)
}

/**
 * Σ (1/(λₙπₙ)) Σ_{k≤n} πₖ of a transient process. The inner sum is of the order of a constant where the weights
 * converge, of πₙ where they grow geometrically or faster, of n·πₙ (times log n at exponent -1) where like a power.
 */
function explodes(birth: Rational, against: number, weightsConverge: boolean): boolean {
  if (weightsConverge) return true
  return orderOf(birth) >= (against > 0 ? 2 : 3)
}

/** A pure birth process: never comes back, explodes if and only if Σ 1/λₙ converges (Feller 1968, XVII.4, from memory). */
export const pureBirthExplodes = (birth: Rational): boolean => orderOf(birth) >= 2

/** Difference of birth and death rate far out: its order in n and leading coefficient. */
export function driftFarOut(birth: Rational, death: Rational): { readonly limit: Fraction | undefined } {
  const order = Math.max(orderOf(birth), orderOf(death), 0)
  const up = expansionOf(birth, order, order + 1)
  const down = expansionOf(death, order, order + 1)
  const terms = up.map((each, k) => subtract(each, down[k]))
  const grows = terms.slice(0, order).some((each) => sign(each) !== 0)
  return { limit: grows ? undefined : terms[order] }
}
