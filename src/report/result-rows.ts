import type { StillmarkDocument } from '../jobs/document.js'
import type { JobDetails } from '../jobs/job-result.js'
import { estimateDigits, exactDigits, percentDigits, significant, trimZeros } from './digits.js'
import { plainText } from './plain-text.js'

/** One line of the table of measures, as text. */
export interface ResultRow {
  readonly measure: string
  readonly exact: string
  readonly estimate: string
  readonly halfWidth: string
  readonly differs: string
  readonly allowed: string
  readonly verdict: string
  readonly note: string
}

/** Measures first, then claims; what is not known is left empty. */
export function resultRows({ exact, simulation, comparison }: StillmarkDocument, details: JobDetails): ResultRow[] {
  const names = new Set([...Object.keys(exact?.measures ?? {}), ...Object.keys(simulation?.measures ?? {})])
  const rows: ResultRow[] = []
  for (const name of names) {
    const value = exact?.measures[name]
    const simulated = simulation?.measures[name]
    const compared = comparison?.measures[name]
    const digits =
      simulated?.estimate === undefined ? undefined : estimateDigits(simulated.estimate, simulated.halfWidth)
    const single = value !== undefined && 'value' in value
    rows.push({
      measure: name,
      exact:
        value === undefined
          ? ''
          : single
            ? exactDigits(value.value, value.errorBound)
            : `${value.points.length} values`,
      estimate: digits?.estimate ?? (simulated?.points === undefined ? '' : `${simulated.points.length} values`),
      halfWidth: digits?.halfWidth ?? '',
      differs:
        compared === undefined
          ? ''
          : single && value.value !== 0
            ? percentDigits(compared.difference / value.value)
            : trimZeros(significant(Math.abs(compared.difference), 2)),
      allowed: compared === undefined ? '' : allowed(details.tolerances?.[name], compared.tolerance, !single),
      verdict: compared?.verdict ?? '',
      // Where nothing can be compared anyway, the reason stands above the table.
      note: compared !== undefined && simulated?.method.startsWith('no interval: ') ? simulated.method.slice(13) : '',
    })
  }
  for (const [name, claim] of Object.entries(comparison?.claims ?? {})) {
    const value = exact?.measures[name]
    const against = claim.exact
    rows.push({
      measure: `claim: ${name}`,
      exact: value !== undefined && 'value' in value ? exactDigits(value.value, value.errorBound) : '',
      estimate: details.claims?.[name]?.written ?? String(claim.claimed),
      halfWidth: '',
      differs: against === null || against === 0 ? '' : percentDigits((claim.claimed - against) / against),
      allowed:
        against === null || against === 0
          ? trimZeros(significant(claim.tolerance, 2))
          : percentDigits(claim.tolerance / against),
      verdict: claim.verdict,
      note: claim.source === undefined ? '' : plainText(claim.source, 60),
    })
  }
  return rows
}

function allowed(
  tolerance: { readonly kind: string; readonly value: number } | undefined,
  absolute: number,
  isShare: boolean,
): string {
  if (tolerance?.kind === 'relative' && !isShare) return `${trimZeros(significant(100 * tolerance.value, 2))} %`
  return trimZeros(significant(absolute, 2))
}
