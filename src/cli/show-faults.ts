import { readFileSync } from 'node:fs'
import type { Fault, StillmarkError } from '../errors/stillmark-error.js'
import { sentenceOf } from '../errors/stillmark-error.js'
import { plainText } from '../report/plain-text.js'

/** Faults that are told one by one. */
const mostShown = 20
const mostColumns = 100

/** What went wrong, each fault with the line it stands in and a mark under the place. */
export function faultsText(error: StillmarkError): string {
  const lines: string[] = []
  const files = new Map<string, readonly string[] | undefined>()
  for (const fault of error.faults.slice(0, mostShown)) {
    lines.push(plainText(sentenceOf(fault), 1000), ...excerpt(fault, files))
  }
  const more = error.faults.length - mostShown
  if (more > 0) lines.push(`and ${more} more like these.`)
  return `${lines.join('\n')}\n`
}

function excerpt({ where }: Fault, files: Map<string, readonly string[] | undefined>): string[] {
  if (where?.file === undefined || where.line === undefined || where.column === undefined) return []
  if (!files.has(where.file)) files.set(where.file, linesOf(where.file))
  const line = files.get(where.file)?.[where.line - 1]
  if (line === undefined || line.trim() === '') return []
  const from = Math.max(0, where.column - mostColumns)
  const shown = line.slice(from, from + mostColumns + 40).replace(/\p{Cc}|[\u202A-\u202E\u2066-\u2069]/gu, ' ')
  return [`    ${shown.trimEnd()}`, `    ${' '.repeat(Math.max(0, where.column - 1 - from))}^`]
}

/** The file once more, for its lines; a pipe can't be read twice, then there are none. */
function linesOf(file: string): readonly string[] | undefined {
  try {
    return readFileSync(file, 'utf8').split(/\r?\n/)
  } catch {
    return undefined
  }
}
