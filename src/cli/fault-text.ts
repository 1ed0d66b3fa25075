import stringWidth from 'string-width'
import type { Fault } from '../errors/stillmark-error.js'
import { plainText } from '../report/plain-text.js'

/** Faults of one job that are shown; the rest are counted. */
const mostFaults = 20
/** Characters of an offending line that are shown. */
const widestLine = 76

/**
 * Faults as people read them: where, what, the line itself with the spot marked, what to do.
 *
 * @param lineOf a line (from 1) of a file, undefined where it can't be had
 */
export function faultsText(
  faults: readonly Fault[],
  lineOf: (file: string, line: number) => string | undefined,
): string {
  const parts = faults.slice(0, mostFaults).map((fault) => faultText(fault, lineOf))
  const more = faults.length - mostFaults
  if (more > 0) parts.push(`… and ${more} more ${more === 1 ? 'fault' : 'faults'} after these.`)
  return `${parts.join('\n')}\n`
}

function faultText(fault: Fault, lineOf: (file: string, line: number) => string | undefined): string {
  const { file, line, column, key } = fault.where ?? {}
  const spot = [file, line, line === undefined ? undefined : column]
    .filter((part) => part !== undefined)
    .map((part) => plainText(String(part)))
    .join(':')
  const named = line === undefined && key !== undefined ? `${spot === '' ? '' : ' '}(${plainText(key)})` : ''
  const place = `${spot}${named}`
  const lines = [`${place === '' ? '' : `${place}  `}${plainText(fault.what, 600)}`]
  const source = file === undefined || line === undefined ? undefined : lineOf(file, line)
  if (source !== undefined && line !== undefined) lines.push(...marked(source, line, column, fault.text))
  if (fault.next !== undefined) lines.push(`  ${plainText(fault.next, 600)}`)
  return lines.join('\n')
}

/** The line with a mark below the offending text; a long line is cut around it. */
function marked(source: string, line: number, column: number | undefined, text: string | undefined): string[] {
  const start = column === undefined ? 0 : Math.min(column - 1, source.length)
  const from = start > widestLine - 24 ? start - 24 : 0
  const before = `${from > 0 ? '…' : ''}${shown(source.slice(from, start))}`
  const rest = source.slice(start, from + widestLine)
  const after = `${shown(rest)}${from + widestLine < source.length ? '…' : ''}`
  if (column === undefined) return [`  ${String(line).padStart(5)} | ${after.trimEnd()}`]
  const offending = text !== undefined && text !== '' && rest.startsWith(text) ? shown(text) : shown(rest.slice(0, 1))
  return [
    `  ${String(line).padStart(5)} | ${before}${after.trimEnd()}`,
    `        | ${' '.repeat(stringWidth(before))}${'^'.repeat(Math.max(1, stringWidth(offending)))}`,
  ]
}

/** As `plainText`, but with the blanks in place, so that what stands below it lines up. */
const shown = (text: string): string =>
  text.replace(/\t/g, ' ').replace(/\p{Cc}|[\u200B-\u200F\u202A-\u202E\u2060-\u2069\uFEFF]/gu, '')
