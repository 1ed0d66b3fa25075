import type { ExactMeasure } from '../stationary/exact-answer.js'
import { type AnyEstimate, type Tolerance, toleranceOf } from './compare-measure.js'
import type { ClaimComparison } from './verdict.js'

/** Somebody's analytic answer to one measure. */
export interface ClaimToJudge {
  readonly measure: string
  readonly value: number
  readonly written: string
  readonly tolerance?: Tolerance
  /** One unit of the last written digit; 0 where it was written as a fraction. */
  readonly lastDigit: number
  readonly source?: string
}

/** Rounding of the claim itself, as a part of its value. */
const rounding = 1e-15

/**
 * A claim is held against the exact value; where there is none, against the simulation, whose interval must then lie
 * wholly inside or outside the tolerance. Without a tolerance it is held to half a unit of its last written digit.
 *
 * @param estimate at the adjusted confidence
 */
export function judgeClaim(
  claim: ClaimToJudge,
  exact: ExactMeasure | undefined,
  estimate: AnyEstimate | undefined,
): ClaimComparison {
  const { value, tolerance, lastDigit, source } = claim
  const base = { claimed: value, ...(source === undefined ? {} : { source }) }
  const allowedAt = (at: number): number =>
    (tolerance === undefined ? lastDigit / 2 : toleranceOf(at, tolerance)) + rounding * Math.abs(value)
  if (exact !== undefined && 'value' in exact) {
    const allowed = allowedAt(exact.value)
    const size = Math.abs(value - exact.value)
    // Inside or outside beyond the exact value's own error; on the border nobody can say.
    const verdict =
      size <= allowed - exact.errorBound
        ? 'agrees'
        : size > allowed + exact.errorBound
          ? 'disagrees'
          : exact.errorBound <= 1e-9 * Math.abs(exact.value)
            ? 'agrees'
            : 'undecided'
    return { ...base, verdict, exact: exact.value, tolerance: allowed }
  }
  if (estimate === undefined || 'points' in estimate)
    return { ...base, verdict: 'undecided', exact: null, tolerance: allowedAt(value) }
  const allowed = allowedAt(estimate.estimate)
  const size = Math.abs(value - estimate.estimate)
  const { halfWidth } = estimate
  const verdict =
    halfWidth === undefined
      ? 'undecided'
      : size + halfWidth <= allowed
        ? 'agrees'
        : size - halfWidth > allowed
          ? 'disagrees'
          : 'undecided'
  return { ...base, verdict, exact: null, tolerance: allowed }
}
