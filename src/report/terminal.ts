import stringWidth from 'string-width'
import type { StillmarkDocument } from '../jobs/document.js'
import type { JobResult } from '../jobs/job-result.js'
import { significant } from './digits.js'
import { factLines } from './facts.js'
import { plainText } from './plain-text.js'
import { type ResultRow, resultRows } from './result-rows.js'
import { verdictSentence } from './verdict-sentence.js'

/** How words may be set off; each returns its text unchanged where there is no colour. */
export interface Paint {
  readonly strong: (text: string) => string
  readonly quiet: (text: string) => string
  readonly good: (text: string) => string
  readonly bad: (text: string) => string
  readonly open: (text: string) => string
}

const unpainted: Paint = { strong: same, quiet: same, good: same, bad: same, open: same }
function same(text: string): string {
  return text
}

const widest = 100
/** Values of a distribution, and findings, that fit a screen. */
const mostPoints = 12
const mostFindings = 4

/** A result as lines of text: words first, then numbers, then what to do. */
export function terminalText({ document, details }: JobResult, columns = 80, paint: Paint = unpainted): string {
  const width = Math.max(60, Math.min(columns, widest))
  const lines: string[] = [paint.strong(plainText(document.scenario.title, width)), '']
  const sentence = document.comparison === undefined ? headline(document) : verdictSentence(document)
  lines.push(...wrapped(sentence, width, 0).map((line) => paintVerdict(line, document, paint)), '')
  const rows = resultRows(document, details)
  if (rows.length > 0) lines.push(...table(rows, document, paint), '')
  lines.push(...distributions(document, paint))
  for (const [label, text] of factLines(document, details)) {
    const [first, ...rest] = wrapped(text, width, 17)
    lines.push(`  ${paint.quiet(label.padEnd(14))} ${first}`, ...rest.map((line) => `${' '.repeat(17)}${line}`))
  }
  const findings = document.comparison?.findings ?? document.findings ?? []
  for (const finding of findings.slice(0, mostFindings)) {
    lines.push('', ...wrapped(plainText(finding.says, 400), width, 2).map((line) => `  ${paint.strong(line)}`))
    lines.push(...wrapped(plainText(finding.evidence, 1200), width, 4).map((line) => `    ${line}`))
    if (finding.next !== details.next)
      lines.push(...wrapped(plainText(finding.next, 400), width, 4).map((line) => `    ${line}`))
  }
  if (findings.length > mostFindings)
    lines.push('', `  and ${findings.length - mostFindings} more findings: see --json or --report`)
  const next = details.next === 'nothing' ? 'nothing.' : plainText(details.next, 400)
  lines.push('', ...wrapped(`Next: ${next}`, width, 0))
  return `${lines.join('\n')}\n`
}

function headline({ format, structure, exact }: StillmarkDocument): string {
  if (structure === undefined) return ''
  const { recurrence } = structure
  const word =
    recurrence === 'undetermined'
      ? 'It is open whether this model settles in a steady state.'
      : recurrence === 'positive recurrent'
        ? 'The model has a steady state.'
        : recurrence === 'mixed'
          ? 'The model settles in a steady state in part of the cases only.'
          : `The model has no steady state: it is ${recurrence}.`
  if (format === 'stillmark/solve/1' && exact) return `${word} Its long-run values, exactly:`
  return word
}

function paintVerdict(line: string, { comparison }: StillmarkDocument, paint: Paint): string {
  if (comparison === undefined) return line
  return comparison.verdict === 'agrees'
    ? paint.good(line)
    : comparison.verdict === 'undecided'
      ? paint.open(line)
      : paint.bad(line)
}

type Column = { readonly head: string; readonly of: (row: ResultRow) => string; readonly right: boolean }

function table(rows: readonly ResultRow[], { format, exact }: StillmarkDocument, paint: Paint): string[] {
  const compared = format === 'stillmark/check/1'
  const errors = exact?.measures ?? {}
  const all: Column[] = [
    { head: 'measure', of: (row) => row.measure, right: false },
    { head: 'exact', of: (row) => row.exact, right: true },
    ...(format === 'stillmark/solve/1'
      ? [{ head: 'error at most', of: (row: ResultRow) => boundOf(errors[row.measure]), right: true }]
      : [
          { head: 'simulated', of: (row: ResultRow) => row.estimate, right: true },
          { head: '', of: (row: ResultRow) => (row.halfWidth === '' ? '' : `± ${row.halfWidth}`), right: false },
        ]),
    ...(compared
      ? [
          { head: 'differs', of: (row: ResultRow) => row.differs, right: true },
          { head: 'allowed', of: (row: ResultRow) => row.allowed, right: true },
          { head: '', of: (row: ResultRow) => row.verdict, right: false },
        ]
      : []),
    { head: '', of: (row) => row.note, right: false },
  ]
  const columns = all.filter((column) => column.head === 'measure' || rows.some((row) => column.of(row) !== ''))
  const widths = columns.map(({ head, of }) => Math.max(stringWidth(head), ...rows.map((row) => stringWidth(of(row)))))
  const cell = (text: string, i: number): string => {
    const room = ' '.repeat(Math.max(0, widths[i] - stringWidth(text)))
    return columns[i].right ? room + text : text + room
  }
  const gap = (i: number): string =>
    i === 0
      ? '  '
      : columns[i].of(rows[0]).startsWith('±') ||
          (columns[i].head === '' && !columns[i].right && i > 0 && columns[i - 1].head === 'simulated')
        ? ' '
        : '  '
  const join = (cells: readonly string[]): string =>
    cells
      .map((text, i) => gap(i) + text)
      .join('')
      .trimEnd()
  const colour = (text: string): string =>
    text.startsWith('agrees')
      ? paint.good(text)
      : text.startsWith('disagrees')
        ? paint.bad(text)
        : text.startsWith('undecided')
          ? paint.open(text)
          : text
  return [
    paint.quiet(join(columns.map(({ head }, i) => cell(head, i)))),
    ...rows.map((row) => join(columns.map(({ of }, i) => colour(cell(of(row), i))))),
  ]
}

const boundOf = (measure: { readonly errorBound: number } | undefined): string =>
  measure === undefined ? '' : measure.errorBound === 0 ? '0' : measure.errorBound.toExponential(0)

/** Values of the distributions, exact and simulated side by side. */
function distributions({ exact, simulation }: StillmarkDocument, paint: Paint): string[] {
  const lines: string[] = []
  const names = new Set([
    ...Object.entries(exact?.measures ?? {}).flatMap(([name, each]) => ('points' in each ? [name] : [])),
    ...Object.entries(simulation?.measures ?? {}).flatMap(([name, each]) => (each.points === undefined ? [] : [name])),
  ])
  for (const name of names) {
    const measure = exact?.measures[name]
    const points = measure !== undefined && 'points' in measure ? measure.points : []
    const simulated = new Map(
      (simulation?.measures[name]?.points ?? []).map(([value, share, halfWidth]) => [
        value,
        [share, halfWidth] as const,
      ]),
    )
    const values =
      points.length > 0
        ? points.map(([value, share]) => [value, share] as const)
        : [...simulated].map(([value, [share]]) => [value, share] as const)
    const largest = Math.max(...values.map(([, share]) => share), 1e-300)
    const shown = mostLikely(values)
    lines.push(
      paint.quiet(
        `  ${name}${shown.length < values.length ? ` (the ${shown.length} likeliest of ${values.length} values)` : ''}`,
      ),
    )
    for (const [value, share] of shown) {
      const found = simulated.get(value)
      const other =
        points.length === 0 || found === undefined
          ? ''
          : `  ${significant(found[0], 3).padStart(9)} ± ${significant(found[1], 2)}`
      lines.push(
        `  ${String(value).padStart(8)}  ${bar(share / largest)}  ${significant(share, 4).padStart(9)}${other}`.trimEnd(),
      )
    }
    lines.push('')
  }
  return lines
}

/** The likeliest values, in their own order. */
function mostLikely(values: readonly (readonly [number, number])[]): readonly (readonly [number, number])[] {
  if (values.length <= mostPoints) return values
  const least = [...values].sort((a, b) => b[1] - a[1])[mostPoints - 1][1]
  return values.filter(([, share]) => share >= least).slice(0, mostPoints)
}

const eighths = ' ▏▎▍▌▋▊▉█'
function bar(part: number): string {
  const units = Math.round(Math.max(0, Math.min(1, part)) * 80)
  return `${'█'.repeat(Math.floor(units / 8))}${units % 8 === 0 ? '' : eighths[units % 8]}`.padEnd(10)
}

/** Lines of at most `width` less `indent`, broken between words. */
function wrapped(text: string, width: number, indent: number): string[] {
  const room = width - indent
  const lines: string[] = []
  let line = ''
  for (const word of text.split(' ')) {
    if (line !== '' && stringWidth(line) + 1 + stringWidth(word) > room) {
      lines.push(line)
      line = word
    } else line = line === '' ? word : `${line} ${word}`
  }
  return [...lines, line]
}
