import type { ShownState, StillmarkDocument } from '../jobs/document.js'
import { significant } from './digits.js'
import { plainText } from './plain-text.js'

/** Values or states that fit a screen. */
const mostLines = 12
const widestName = 32

/** A distribution as lines: a heading, then value, bar, share, and what the simulation found. */
export interface DistributionText {
  readonly heading: string
  readonly lines: readonly string[]
}

/** Every distribution among the measures, and the states of `solve --states`, each cut to its likeliest values. */
export function distributionTexts({ exact, simulation }: StillmarkDocument): DistributionText[] {
  const names = new Set([
    ...Object.entries(exact?.measures ?? {}).flatMap(([name, each]) => ('points' in each ? [name] : [])),
    ...Object.entries(simulation?.measures ?? {}).flatMap(([name, each]) => (each.points === undefined ? [] : [name])),
  ])
  const texts = [...names].map((name) => {
    const measure = exact?.measures[name]
    const points = measure !== undefined && 'points' in measure ? measure.points : undefined
    const simulated = simulation?.measures[name]?.points ?? []
    if (points === undefined)
      return distribution(
        name,
        'values',
        simulated.map(([value, share, halfWidth]) => [String(value), share, `± ${significant(halfWidth, 2)}`]),
      )
    const found = new Map(simulated.map(([value, share, halfWidth]) => [value, [share, halfWidth] as const]))
    return distribution(
      name,
      'values',
      points.map(([value, share]) => {
        const [estimate, halfWidth] = found.get(value) ?? []
        const beside =
          simulation === undefined || estimate === undefined || halfWidth === undefined
            ? ''
            : `simulated ${significant(estimate, 3)} ± ${significant(halfWidth, 2)}`
        return [String(value), share, beside]
      }),
    )
  })
  const states = exact?.distribution
  if (states === undefined) return texts
  const rows = states.map(([state, share]) => [stateText(state), share, ''] as const)
  return [...texts, distribution('share of time in each state', 'states', rows)]
}

/** A state as people read it: its name, or `occupied 3, waiting 0 2`. */
export const stateText = (state: ShownState): string =>
  plainText(
    typeof state === 'string'
      ? state
      : Object.entries(state)
          .map(([name, value]) => `${name} ${Array.isArray(value) ? value.join(' ') : value}`)
          .join(', '),
    widestName,
  )

type Row = readonly [value: string, share: number, beside: string]

function distribution(name: string, what: string, rows: readonly Row[]): DistributionText {
  const shown = likeliest(rows)
  const largest = Math.max(...shown.map(([, share]) => share), Number.MIN_VALUE)
  const width = Math.max(4, ...shown.map(([value]) => value.length))
  const shares = shown.map(([, share]) => significant(share, 4))
  const shareWidth = Math.max(...shares.map((share) => share.length), 0)
  return {
    heading:
      shown.length < rows.length
        ? `${name} (the ${shown.length} likeliest of ${rows.length.toLocaleString('en-US')} ${what})`
        : name,
    lines: shown.map(([value, share, beside], i) =>
      `${what === 'states' ? value.padEnd(width) : value.padStart(width)}  ${bar(share / largest)}  ${shares[i].padEnd(shareWidth)}  ${beside}`.trimEnd(),
    ),
  }
}

/** The likeliest rows, in their own order. */
function likeliest(rows: readonly Row[]): readonly Row[] {
  if (rows.length <= mostLines) return rows
  const chosen = new Set(
    rows
      .map((_, i) => i)
      .sort((a, b) => rows[b][1] - rows[a][1] || a - b)
      .slice(0, mostLines),
  )
  return rows.filter((_, i) => chosen.has(i))
}

const eighths = ' ▏▎▍▌▋▊▉█'
function bar(part: number): string {
  const units = Math.round(Math.max(0, Math.min(1, part)) * 80)
  return `${'█'.repeat(Math.floor(units / 8))}${units % 8 === 0 ? '' : eighths[units % 8]}`.padEnd(10)
}
