import {
  absolute,
  add,
  compare,
  type Fraction,
  fraction,
  negate,
  one,
  sign,
  subtract,
  toNumber,
  zero,
} from '../numbers/fraction.js'
import type { Spot } from './expression.js'
import { newFaultList } from './fault-list.js'
import type { LocatedMap } from './located-yaml.js'
import { MatrixFault, readMatrix } from './matrix-file.js'
import { suggestion } from './names.js'
import { constantsOnly, constantValue, entriesOf, entryOf, expressionAt, type Reading, scalarOf } from './reading.js'
import type { TableBody, TableEntry } from './scenario.js'
import { writtenNumber } from './written-number.js'

/** Rows may miss 1 (or a generator's diagonal its row) by so much: taken as the rounding of written decimals. */
export const rounding = fraction(1n, 10n ** 9n)

/** What `matrix: file` is read through. */
export type ReadBeside = (name: string) => string

interface RawTable {
  readonly states: readonly string[]
  readonly entries: readonly (TableEntry & { readonly asFraction: boolean })[]
  /** The file that the entries' spots are of, where it is another one. */
  readonly matrixFile?: string
}

export function parseTableBody(
  reading: Reading,
  root: LocatedMap,
  time: 'continuous' | 'discrete',
  readBeside: ReadBeside,
): TableBody | undefined {
  const raw =
    entryOf(root, 'matrix') === undefined ? inlineTable(reading, root, time) : matrixTable(reading, root, readBeside)
  if (raw === undefined) return undefined
  const start = startOf(reading, root, raw.states)
  const faults = raw.matrixFile === undefined ? reading.faults : newFaultList(raw.matrixFile)
  const stay = entryOf(root, 'remainder') !== undefined
  const entries = checkRows({ ...reading, faults }, raw, time, stay, root.spot)
  if (raw.matrixFile !== undefined) {
    for (const fault of faults.sorted().slice(0, 20)) {
      const { line, column } = fault.where ?? {}
      const spot = entryOf(root, 'matrix')?.value.spot
      reading.faults.add(
        fault.code,
        spot && { ...spot, column: spot.column + reading.faults.count },
        'matrix',
        `${raw.matrixFile}:${line ?? 1}:${column ?? 1}: ${fault.what}`,
        fault.next,
        fault.text,
      )
    }
  }
  if (start === undefined || entries === undefined || faults.count > 0) return undefined
  return { kind: 'table', states: raw.states, start, entries }
}

function stateNames(reading: Reading, root: LocatedMap): readonly string[] | undefined {
  const list = entryOf(root, 'states')?.value
  if (list?.kind !== 'list') return undefined
  const names: string[] = []
  const seen = new Set<string>()
  for (const item of list.items) {
    if (item.kind !== 'scalar') continue
    const name = item.text.trim()
    if (name === '' || name.length > 100 || /\p{Cc}/u.test(name)) {
      reading.faults.add(
        'bad-name',
        item.spot,
        'states',
        `"${name.slice(0, 40)}" can't name a state.`,
        'A state of a table is called by a short text of at most 100 characters.',
      )
    } else if (seen.has(name)) {
      reading.faults.add(
        'name-twice',
        item.spot,
        'states',
        `The state "${name}" is listed twice.`,
        'Call each state by a name of its own.',
        name,
      )
    }
    seen.add(name)
    names.push(name)
  }
  if (names.length === 0) {
    reading.faults.add('no-states', list.spot, 'states', 'The table has no states.', 'List them: "states: [up, down]".')
    return undefined
  }
  return names
}

function inlineTable(reading: Reading, root: LocatedMap, time: 'continuous' | 'discrete'): RawTable | undefined {
  const { faults } = reading
  const wanted = time === 'continuous' ? 'rates' : 'probabilities'
  const other = time === 'continuous' ? 'probabilities' : 'rates'
  const misused = entryOf(root, other)
  if (misused !== undefined) {
    faults.add(
      'wrong-clock',
      misused.keySpot,
      other,
      `The table has "${other}", but time is ${time}.`,
      `Write "${wanted}", or change "time".`,
    )
    return undefined
  }
  const states = stateNames(reading, root)
  const table = entryOf(root, wanted)
  if (entryOf(root, 'states') === undefined) {
    faults.add(
      'key-missing',
      table?.keySpot ?? root.spot,
      'states',
      '"states" is missing.',
      'List the states: "states: [keen, worn, failed]".',
    )
    return undefined
  }
  if (table === undefined) {
    faults.add(
      'key-missing',
      root.spot,
      wanted,
      `"${wanted}" is missing.`,
      `Give the table by row: "${wanted}: { keen: { worn: 0.06 } }", or "matrix: file.mtx".`,
    )
    return undefined
  }
  if (states === undefined) return undefined
  const indexOf = new Map(states.map((name, i) => [name, i]))
  const place = (name: string, spot: Spot, key: string): number | undefined => {
    const index = indexOf.get(name.trim())
    if (index === undefined)
      faults.add('unknown-state', spot, key, `"${name.slice(0, 60)}" is not a state.`, suggestion(name, states), name)
    return index
  }
  const entries: (TableEntry & { asFraction: boolean })[] = []
  for (const row of entriesOf(root, wanted)) {
    const from = place(row.key, row.keySpot, `${wanted}.${row.key}`)
    if (row.value.kind !== 'map') continue
    for (const { key, keySpot, value } of row.value.entries) {
      const address = `${wanted}.${row.key}.${key}`
      const to = place(key, keySpot, address)
      const expression = expressionAt(reading, value, address, constantsOnly, true)
      if (expression === undefined || from === undefined || to === undefined) continue
      const number = constantValue(reading, expression, value.spot, address)
      const asFraction = value.kind === 'scalar' && (writtenNumber(value.text)?.asFraction ?? false)
      if (number !== undefined) entries.push({ from, to, value: number, at: value.spot, asFraction })
    }
  }
  return { states, entries }
}

function matrixTable(reading: Reading, root: LocatedMap, readBeside: ReadBeside): RawTable | undefined {
  const { faults } = reading
  const node = scalarOf(root, 'matrix')
  if (node === undefined) return undefined
  for (const key of ['rates', 'probabilities']) {
    const extra = entryOf(root, key)
    if (extra !== undefined)
      faults.add('two-bodies', extra.keySpot, key, `Both "matrix" and "${key}" are given.`, 'Keep one of them.')
  }
  let matrix: ReturnType<typeof readMatrix>
  try {
    matrix = readMatrix(node.text, readBeside(node.text))
  } catch (error) {
    if (error instanceof MatrixFault) {
      faults.add(
        'bad-matrix',
        node.spot,
        'matrix',
        `${node.text}:${error.line}:${error.column}: ${error.message}`,
        error.next,
        node.text,
      )
    } else if (error instanceof Error && 'code' in error) {
      faults.add(
        'no-matrix',
        node.spot,
        'matrix',
        `The file "${node.text}" can't be read.`,
        "It is looked for in the scenario's folder.",
        node.text,
      )
    } else throw error
    return undefined
  }
  const given = entryOf(root, 'states') === undefined ? undefined : stateNames(reading, root)
  if (given !== undefined && given.length !== matrix.size) {
    faults.add(
      'states-and-matrix',
      entryOf(root, 'states')?.value.spot,
      'states',
      `There are ${given.length} states for a ${matrix.size} by ${matrix.size} matrix.`,
      'Name every state, or leave "states" out: then they are called s1, s2, ….',
    )
    return undefined
  }
  return {
    states: given ?? Array.from({ length: matrix.size }, (_, i) => `s${i + 1}`),
    entries: matrix.entries.map((entry) => ({ ...entry, asFraction: false })),
    matrixFile: node.text,
  }
}

function startOf(reading: Reading, root: LocatedMap, states: readonly string[]): number | undefined {
  const node = scalarOf(root, 'start')
  if (node === undefined) return 0
  const index = states.indexOf(node.text.trim())
  if (index >= 0) return index
  reading.faults.add(
    'unknown-state',
    node.spot,
    'start',
    `"${node.text.slice(0, 60)}" is not a state.`,
    suggestion(node.text, states),
    node.text,
  )
  return undefined
}

/** Signs, sums and a generator's diagonal; the rest of a row stays where the file says so. */
function checkRows(
  { faults }: Reading,
  { states, entries }: RawTable,
  time: 'continuous' | 'discrete',
  stay: boolean,
  spot: Spot,
): readonly TableEntry[] | undefined {
  const off: Fraction[] = states.map(() => zero)
  const diagonal: (Fraction | undefined)[] = states.map(() => undefined)
  const place: (Spot | undefined)[] = states.map(() => undefined)
  const allFractions: boolean[] = states.map(() => true)
  const before = faults.count
  for (const { from, to, value, at, asFraction } of entries) {
    place[from] ??= at
    allFractions[from] &&= asFraction
    const key = `${states[from]} → ${states[to]}`
    const generatorDiagonal = time === 'continuous' && from === to
    if (sign(value) < 0 && !generatorDiagonal) {
      faults.add(
        'negative-rate',
        at,
        key,
        `From "${states[from]}" to "${states[to]}" stands ${toNumber(value)}, which is negative.`,
        'Rates and probabilities are 0 or more.',
      )
    } else if (time === 'discrete' && compare(value, one) > 0) {
      faults.add(
        'probability-over-1',
        at,
        key,
        `From "${states[from]}" to "${states[to]}" stands ${toNumber(value)}, which is over 1.`,
        'A probability is at most 1.',
      )
    }
    if (from === to) diagonal[from] = add(diagonal[from] ?? zero, value)
    else off[from] = add(off[from], value)
  }
  if (faults.count > before) return undefined
  const kept = entries
    .filter(({ from, to }) => time === 'discrete' || from !== to)
    .map(({ asFraction, ...entry }) => entry)
  const added: TableEntry[] = []
  states.forEach((name, i) => {
    const own = diagonal[i]
    if (time === 'continuous') {
      // A positive diagonal would be a move that leaves the state as it is, which a table can't tell from a mistake.
      if (own === undefined || sign(own) === 0) return
      const miss = absolute(add(own, off[i]))
      const scale = compare(absolute(own), off[i]) > 0 ? absolute(own) : off[i]
      if (compare(miss, { numerator: scale.numerator, denominator: scale.denominator * rounding.denominator }) > 0) {
        faults.add(
          'diagonal-off',
          place[i] ?? spot,
          name,
          `The diagonal of "${name}" is ${toNumber(own)}; minus the sum of its row is ${toNumber(negate(off[i]))}.`,
          'Correct it, or leave the diagonal out.',
        )
      }
      return
    }
    const rest = subtract(one, add(off[i], own ?? zero))
    if (stay) {
      if (compare(rest, negate(rounding)) < 0)
        faults.add(
          'probabilities-off',
          place[i] ?? spot,
          name,
          `The row of "${name}" sums to ${toNumber(subtract(one, rest))}, over 1.`,
          'Correct the row.',
        )
      else if (sign(rest) > 0) added.push({ from: i, to: i, value: rest })
      return
    }
    const exact = allFractions[i] && place[i] !== undefined
    if (exact ? sign(rest) !== 0 : compare(absolute(rest), rounding) > 0) {
      faults.add(
        'probabilities-off',
        place[i] ?? spot,
        name,
        `The row of "${name}" sums to ${toNumber(subtract(one, rest))}, not to 1.`,
        'Correct it, or write "remainder: stay" at the top level where the rest stays.',
      )
    }
  })
  return faults.count > before ? undefined : [...kept, ...added]
}
