import stringWidth from 'string-width'
import type { StillmarkDocument } from '../jobs/document.js'
import type { JobResult } from '../jobs/job-result.js'
import { boundDigits } from './digits.js'
import { distributionTexts } from './distribution-lines.js'
import { factLines } from './facts.js'
import { nextAction } from './next-action.js'
import { plainText } from './plain-text.js'
import { type ResultRow, resultRows, whyNoIntervals } from './result-rows.js'
import { verdictSentence } from './verdict-sentence.js'

/** How words may be set off; each returns its text unchanged where there is no colour. */
export interface Paint {
  readonly strong: (text: string) => string
  readonly quiet: (text: string) => string
  readonly good: (text: string) => string
  readonly bad: (text: string) => string
  readonly open: (text: string) => string
}

const same = (text: string): string => text
const unpainted: Paint = { strong: same, quiet: same, good: same, bad: same, open: same }

const widest = 100
const mostFindings = 4
/** A table that is too wide cuts the names of its measures, but not further than this. */
const leastName = 16

/** A result as lines of text: words first, then numbers, then what to do. */
export function terminalText(result: JobResult, columns = 80, paint: Paint = unpainted): string {
  const { document, details, exitStatus } = result
  const width = Math.max(60, Math.min(columns, widest))
  const verdictPaint = exitStatus === 0 ? paint.good : exitStatus === 3 ? paint.open : paint.bad
  const lines: string[] = [paint.strong(plainText(document.scenario.title, width)), '']
  lines.push(...wrapped(verdictSentence(document, details), width, 0).map(verdictPaint), '')
  const rows = resultRows(document, details)
  if (rows.length > 0) {
    lines.push(...table(rows, document, width, paint))
    const reason = whyNoIntervals(document)
    if (reason !== undefined) lines.push(...wrapped(`No intervals: ${reason}.`, width, 2).map((line) => `  ${line}`))
    lines.push('')
  }
  for (const { heading, lines: values } of distributionTexts(document))
    lines.push(paint.quiet(`  ${heading}`), ...values.map((line) => `    ${line}`), '')
  for (const [label, text] of factLines(document, details)) {
    const [first, ...rest] = wrapped(text, width, 17)
    lines.push(`  ${paint.quiet(label.padEnd(14))} ${first}`, ...rest.map((line) => `${' '.repeat(17)}${line}`))
  }
  const findings = document.comparison?.findings ?? document.findings ?? []
  for (const finding of findings.slice(0, mostFindings)) {
    lines.push('', ...wrapped(plainText(finding.says, 400), width, 2).map((line) => `  ${paint.strong(line)}`))
    lines.push(...wrapped(plainText(finding.evidence, 1200), width, 4).map((line) => `    ${line}`))
    if (finding.next !== details.next) {
      const [first, ...rest] = wrapped(plainText(finding.next, 400), width, 6)
      lines.push(`    → ${first}`, ...rest.map((line) => `      ${line}`))
    }
  }
  if (findings.length > mostFindings)
    lines.push('', `  and ${findings.length - mostFindings} more: --json and --report list them all`)
  lines.push('', ...wrapped(`Next: ${nextAction(result)}`, width, 0))
  return `${lines.join('\n')}\n`
}

interface Column {
  readonly head: string
  readonly of: (row: ResultRow) => string
  readonly right: boolean
  /** Belongs to the column before: one blank between them. */
  readonly close?: true
}

function columnsOf({ format, exact }: StillmarkDocument): readonly Column[] {
  const errors = exact?.measures ?? {}
  const measure: Column = { head: 'measure', of: (row) => row.measure, right: false }
  const exactly: Column = { head: 'exact', of: (row) => row.exact, right: true }
  if (format === 'stillmark/solve/1') {
    const bound = (row: ResultRow) =>
      errors[row.measure] === undefined ? '' : boundDigits(errors[row.measure].errorBound)
    return [measure, exactly, { head: 'error at most', of: bound, right: true }]
  }
  return [
    measure,
    exactly,
    { head: 'simulated', of: (row) => row.estimate, right: true },
    { head: '', of: (row) => (row.halfWidth === '' ? '' : `± ${row.halfWidth}`), right: false, close: true },
    { head: 'differs', of: (row) => row.differs, right: true },
    { head: 'allowed', of: (row) => row.allowed, right: true },
    { head: '', of: (row) => row.verdict, right: false },
  ]
}

const widthOf = ({ head, of }: Column, rows: readonly ResultRow[]): number =>
  Math.max(stringWidth(head), ...rows.map((row) => stringWidth(of(row))))

const tableWidth = (columns: readonly Column[], rows: readonly ResultRow[]): number =>
  columns.reduce((total, column) => total + (column.close ? 1 : 2) + widthOf(column, rows), 0)

/** Columns in which no row says anything are left out; a note that does not fit beside its row stands below it. */
function table(rows: readonly ResultRow[], document: StillmarkDocument, width: number, paint: Paint): string[] {
  const all = columnsOf(document).filter(({ of }, i) => i === 0 || rows.some((row) => of(row) !== ''))
  const names = Math.max(leastName, widthOf(all[0], rows) - Math.max(0, tableWidth(all, rows) - width))
  const columns = [{ ...all[0], of: (row: ResultRow) => plainText(row.measure, names) }, ...all.slice(1)]
  const widths = columns.map((column) => widthOf(column, rows))
  const line = (cells: readonly string[], painted: (text: string) => string = same): string =>
    cells
      .map((text, i) => {
        const room = ' '.repeat(Math.max(0, widths[i] - stringWidth(text)))
        return `${columns[i].close ? ' ' : '  '}${columns[i].right ? room + text : painted(text) + room}`
      })
      .join('')
      .trimEnd()
  return [
    paint.quiet(line(columns.map(({ head }) => head))),
    ...rows.flatMap((row) => {
      const cells = columns.map(({ of }) => of(row))
      const text = line(cells, (cell) => verdictPainted(cell, row.verdict, paint))
      if (row.note === '') return [text]
      return stringWidth(line(cells)) + 2 + stringWidth(row.note) <= width
        ? [`${text}  ${row.note}`]
        : [text, ...wrapped(row.note, width, 6).map((each) => `      ${paint.quiet(each)}`)]
    }),
  ]
}

function verdictPainted(cell: string, verdict: string, paint: Paint): string {
  if (cell !== verdict || verdict === '') return cell
  return verdict === 'agrees' ? paint.good(cell) : verdict === 'undecided' ? paint.open(cell) : paint.bad(cell)
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
