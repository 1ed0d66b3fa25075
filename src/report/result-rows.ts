import type { SimulatedMeasure, StillmarkDocument } from '../jobs/document.js'
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

/** `solve` shows the digits that it is asked for, the others what fits beside the simulation. */
const digitsOf = (format: StillmarkDocument['format']): number | undefined =>
  format === 'stillmark/solve/1' ? 12 : undefined

const whyNoInterval = ({ method }: SimulatedMeasure): string | undefined =>
  method.startsWith('no interval: ') ? method.slice('no interval: '.length) : undefined

/** Why no measure has an interval, where that is so and one reason holds for all: said once, not in every row. */
export function whyNoIntervals({ simulation }: StillmarkDocument): string | undefined {
  const reasons = new Set(Object.values(simulation?.measures ?? {}).map(whyNoInterval))
  return reasons.size === 1 ? [...reasons][0] : undefined
}

/** Measures first, then claims; what is not known is left empty. */
export function resultRows(document: StillmarkDocument, details: JobDetails): ResultRow[] {
  const { exact, simulation, comparison, format } = document
  const names = new Set([...Object.keys(exact?.measures ?? {}), ...Object.keys(simulation?.measures ?? {})])
  const rows: ResultRow[] = []
  const shared = whyNoIntervals(document)
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
            ? exactDigits(value.value, value.errorBound, digitsOf(format))
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
      note: shared === undefined && simulated !== undefined ? (whyNoInterval(simulated) ?? '') : '',
    })
  }
  for (const [name, claim] of Object.entries(comparison?.claims ?? {})) {
    const value = exact?.measures[name]
    const against = claim.exact
    rows.push({
      measure: `claim: ${name}`,
      exact: value !== undefined && 'value' in value ? exactDigits(value.value, value.errorBound) : '',
      estimate: plainText(details.claims?.[name]?.written ?? String(claim.claimed), 20),
      halfWidth: '',
      differs: against === null || against === 0 ? '' : percentDigits((claim.claimed - against) / against),
      allowed:
        against === null || against === 0
          ? trimZeros(significant(claim.tolerance, 2))
          : `${trimZeros(significant(Math.abs((100 * claim.tolerance) / against), 2))} %`,
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
