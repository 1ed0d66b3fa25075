import { parse } from 'csv-parse/sync'
import { fractionOfText, negate } from '../numbers/fraction.js'
import type { TableEntry } from './scenario.js'
import { writtenNumber } from './written-number.js'

export interface Matrix {
  readonly size: number
  readonly entries: readonly TableEntry[]
}

/** What is wrong with a matrix file, at its line and column. */
export class MatrixFault extends Error {
  readonly line: number
  readonly column: number
  readonly next: string
  constructor(line: number, column: number, what: string, next: string) {
    super(what)
    this.line = line
    this.column = column
    this.next = next
  }
}

const largestTable = 5_000_000

/** Matrix Market (coordinate or array; real or integer; general, symmetric or skew-symmetric) or CSV by its name. */
export function readMatrix(name: string, text: string): Matrix {
  if (/\.mtx$/i.test(name)) return matrixMarket(text)
  if (/\.csv$/i.test(name)) return commaSeparated(text)
  throw new MatrixFault(
    1,
    1,
    `"${name}" is neither a .mtx nor a .csv file.`,
    'Give a Matrix Market file (.mtx) or a CSV file.',
  )
}

/**
 * Source: the Matrix Market exchange formats (Boisvert, Pozo and Remington 1996, from memory): a banner, comments
 * that begin with %, a size line, then entries counted from 1; an array goes column by column.
 */
function matrixMarket(text: string): Matrix {
  const lines = text.split(/\r?\n/)
  const banner = /^%%MatrixMarket\s+matrix\s+(\S+)\s+(\S+)\s+(\S+)\s*$/i.exec(lines[0] ?? '')
  if (banner === null)
    throw new MatrixFault(
      1,
      1,
      'The first line is not a Matrix Market banner.',
      'It reads "%%MatrixMarket matrix coordinate real general".',
    )
  const [layout, field, symmetry] = banner.slice(1).map((word) => word.toLowerCase())
  if (!['coordinate', 'array'].includes(layout))
    throw new MatrixFault(1, 1, `The layout "${layout}" is not known.`, 'Allowed: coordinate, array.')
  if (!['real', 'double', 'integer'].includes(field))
    throw new MatrixFault(1, 1, `A matrix of kind "${field}" has no probabilities or rates.`, 'Allowed: real, integer.')
  if (!['general', 'symmetric', 'skew-symmetric'].includes(symmetry))
    throw new MatrixFault(
      1,
      1,
      `The symmetry "${symmetry}" is not known.`,
      'Allowed: general, symmetric, skew-symmetric.',
    )
  let at = 1
  const skip = () => {
    while (at < lines.length && (lines[at].startsWith('%') || lines[at].trim() === '')) at++
  }
  skip()
  const sizes = (lines[at] ?? '').trim().split(/\s+/).map(Number)
  const [rows, columns, stored] = sizes
  if (sizes.length !== (layout === 'coordinate' ? 3 : 2) || sizes.some((size) => !Number.isInteger(size) || size < 0)) {
    throw new MatrixFault(
      at + 1,
      1,
      `The size line "${(lines[at] ?? '').slice(0, 40)}" can't be read.`,
      layout === 'coordinate' ? 'It holds rows, columns and the number of entries.' : 'It holds rows and columns.',
    )
  }
  if (rows !== columns || rows === 0)
    throw new MatrixFault(
      at + 1,
      1,
      `The matrix is ${rows} by ${columns}; a chain needs as many rows as columns, at least one.`,
      'Check the size line.',
    )
  if (rows > largestTable)
    throw new MatrixFault(
      at + 1,
      1,
      `The matrix has ${rows.toLocaleString('en-US')} rows.`,
      `At most ${largestTable.toLocaleString('en-US')} states can be read.`,
    )
  at++
  const entries: TableEntry[] = []
  const put = (row: number, column: number, word: string, wordColumn: number) => {
    const value = fractionOfText(word)
    if (value === undefined)
      throw new MatrixFault(
        at + 1,
        wordColumn,
        `"${word.slice(0, 40)}" is not a number that can be kept.`,
        'Write a decimal number.',
      )
    const spot = { line: at + 1, column: wordColumn }
    entries.push({ from: row, to: column, value, at: spot })
    if (symmetry !== 'general' && row !== column)
      entries.push({ from: column, to: row, value: symmetry === 'symmetric' ? value : negate(value), at: spot })
  }
  if (layout === 'coordinate') {
    let read = 0
    for (skip(); at < lines.length; at++, skip()) {
      const line = lines[at]
      const words = line.trim().split(/\s+/)
      const [row, column] = words.map(Number)
      if (words.length !== 3)
        throw new MatrixFault(
          at + 1,
          1,
          `"${line.slice(0, 40)}" is not row, column and value.`,
          'Write three words a line.',
        )
      if (!Number.isInteger(row) || !Number.isInteger(column) || row < 1 || row > rows || column < 1 || column > rows) {
        throw new MatrixFault(
          at + 1,
          1,
          `The place ${words[0]}, ${words[1]} is not in a ${rows} by ${rows} matrix.`,
          'Rows and columns are counted from 1.',
        )
      }
      put(row - 1, column - 1, words[2], line.lastIndexOf(words[2]) + 1)
      read++
    }
    if (read !== stored)
      throw new MatrixFault(
        lines.length,
        1,
        `The size line announces ${stored} entries, the file has ${read}.`,
        'The file may be cut off, or its size line is wrong.',
      )
    return { size: rows, entries }
  }
  const strict = symmetry === 'skew-symmetric' ? 1 : 0
  for (let column = 0; column < rows; column++) {
    for (let row = symmetry === 'general' ? 0 : column + strict; row < rows; row++) {
      skip()
      if (at >= lines.length)
        throw new MatrixFault(
          lines.length,
          1,
          'The file ends before the matrix does.',
          'It may be cut off, or its size line is wrong.',
        )
      put(row, column, lines[at].trim(), 1)
      at++
    }
  }
  skip()
  if (at < lines.length)
    throw new MatrixFault(at + 1, 1, 'The file goes on after the matrix has ended.', 'Its size line may be wrong.')
  return { size: rows, entries }
}

/** A square table of numbers, row by row; nothing else. */
function commaSeparated(text: string): Matrix {
  let rows: readonly (readonly string[])[]
  try {
    rows = parse(text, { bom: true, trim: true, skip_empty_lines: true, relax_column_count: true })
  } catch (error) {
    throw new MatrixFault(
      (error as { lines?: number }).lines ?? 1,
      1,
      'The file is not valid CSV.',
      'Check the quotes.',
    )
  }
  const size = rows.length
  if (size === 0) throw new MatrixFault(1, 1, 'The file is empty.', 'Write one line a state, one number a column.')
  const entries: TableEntry[] = []
  rows.forEach((row, from) => {
    if (row.length !== size)
      throw new MatrixFault(
        from + 1,
        1,
        `This line has ${row.length} numbers, the file has ${size} lines.`,
        'A chain needs as many columns as lines, and no header.',
      )
    let column = 1
    row.forEach((word, to) => {
      const written = writtenNumber(word)
      if (written === undefined)
        throw new MatrixFault(
          from + 1,
          column,
          `"${word.slice(0, 40)}" is not a number.`,
          'Write numbers only, without a header.',
        )
      if (written.value.numerator !== 0n)
        entries.push({ from, to, value: written.value, at: { line: from + 1, column } })
      column += word.length + 1
    })
  })
  return { size, entries }
}
