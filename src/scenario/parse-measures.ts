import { compare, type Fraction, one, sign, zero } from '../numbers/fraction.js'
import type { Expression, Spot } from './expression.js'
import { isLinearInFirings, mentionsTransition } from './firings.js'
import type { Located, LocatedEntry, LocatedMap } from './located-yaml.js'
import { suggestion } from './names.js'
import {
  constantsOnly,
  constantValue,
  entriesOf,
  entryOf,
  expressionAt,
  overState,
  type Reading,
  scalarOf,
} from './reading.js'
import type { Measure, Side, Subject } from './scenario.js'
import { writtenNumber } from './written-number.js'

const kinds = ['average', 'share', 'frequency', 'ratio', 'quantile', 'distribution'] as const
type Kind = (typeof kinds)[number]

/** @param states names of a table's states; undefined for a model by variables */
export function parseMeasures(reading: Reading, root: LocatedMap, states: readonly string[] | undefined): Measure[] {
  const measures: Measure[] = []
  for (const entry of entriesOf(root, 'measures')) {
    const measure = parseMeasure(reading, entry, states)
    if (measure !== undefined) measures.push(measure)
  }
  return measures
}

function parseMeasure(
  reading: Reading,
  { key: name, keySpot, value }: LocatedEntry,
  states: readonly string[] | undefined,
): Measure | undefined {
  if (value.kind !== 'map') return undefined
  const { faults } = reading
  const key = `measures.${name}`
  const given = kinds.filter((kind) => entryOf(value, kind) !== undefined)
  if (given.length !== 1) {
    // An unknown key has been reported already: nothing more is known of such a measure.
    const known: readonly string[] = [...kinds, 'level']
    if (given.length === 0 && value.entries.some((each) => !known.includes(each.key))) return undefined
    const what =
      given.length === 0
        ? `The measure "${name}" says nothing.`
        : `The measure "${name}" says two things: ${given.join(' and ')}.`
    faults.add('measure-kind', keySpot, key, what, `Give it one of ${kinds.join(', ')}.`)
    return undefined
  }
  const [kind] = given
  const node = entryOf(value, kind)?.value as Located
  const address = `${key}.${kind}`
  const level = entryOf(value, 'level')
  if (level !== undefined && kind !== 'quantile') {
    faults.add(
      'level-alone',
      level.keySpot,
      `${key}.level`,
      '"level" belongs to a quantile.',
      'Leave it out, or ask for a "quantile".',
    )
  }
  if (kind === 'ratio') {
    if (node.kind !== 'list') return undefined
    if (node.items.length !== 2) {
      faults.add(
        'ratio-sides',
        node.spot,
        address,
        `A ratio has two sides, here ${node.items.length === 1 ? 'is 1' : `are ${node.items.length}`}.`,
        'Write "ratio: [above, below]".',
      )
      return undefined
    }
    const [top, bottom] = node.items.map((item) => parseSide(reading, item, address, states))
    return top && bottom && { name, at: keySpot, kind, top, bottom }
  }
  const of = parseSubject(reading, node, address, kind, states)
  if (of === undefined) return undefined
  if (kind !== 'quantile') return { name, at: keySpot, kind, of }
  const parsed = parseLevel(reading, value, keySpot, `${key}.level`)
  return parsed && { name, at: keySpot, kind, of, level: parsed }
}

function parseLevel(reading: Reading, map: LocatedMap, at: Spot, key: string): Fraction | undefined {
  const node = scalarOf(map, 'level')
  if (node === undefined) {
    reading.faults.add('key-missing', at, key, 'The quantile has no "level".', 'Write "level: 0.95" or "level: 95 %".')
    return undefined
  }
  const level = writtenNumber(node.text)?.value
  if (level === undefined || sign(level) <= 0 || compare(level, one) >= 0) {
    reading.faults.add(
      'bad-level',
      node.spot,
      key,
      `"${node.text.slice(0, 40)}" is no level.`,
      'A level lies between 0 and 1: 0.95 or 95 %.',
      node.text,
    )
    return undefined
  }
  return level
}

/** A side counts firings where it names transitions, else it is averaged over time. */
function parseSide(
  reading: Reading,
  node: Located,
  key: string,
  states: readonly string[] | undefined,
): Side | undefined {
  if (states !== undefined) {
    const of = tableSubject(reading, node, key, states)
    return of && { kind: of.kind === 'moves' ? 'frequency' : 'average', of }
  }
  if (node.kind !== 'scalar') {
    reading.faults.add(
      'wrong-kind',
      node.spot,
      key,
      'A side of this ratio is no expression.',
      'Lists and maps of states belong to a table.',
    )
    return undefined
  }
  const of = expressionAt(reading, node, key, { ...overState, transitions: true })
  if (of === undefined) return undefined
  if (!mentionsTransition(of)) return { kind: 'average', of: { kind: 'expression', of } }
  return checkFirings(reading, of, node.spot, key) ? { kind: 'frequency', of: { kind: 'expression', of } } : undefined
}

function checkFirings(reading: Reading, of: Expression, spot: Spot, key: string): boolean {
  if (isLinearInFirings(of)) return true
  reading.faults.add(
    'not-linear',
    of.at ?? spot,
    key,
    'Frequencies can be added, subtracted and multiplied by constants only.',
    'Divide two of them with "ratio"; average what depends on the state on its own.',
  )
  return false
}

function parseSubject(
  reading: Reading,
  node: Located,
  key: string,
  kind: Exclude<Kind, 'ratio'>,
  states: readonly string[] | undefined,
): Subject | undefined {
  if (states !== undefined) {
    const subject = tableSubject(reading, node, key, states)
    if (subject === undefined) return undefined
    const wanted = kind === 'frequency' ? 'moves' : 'states'
    if (subject.kind !== wanted) {
      reading.faults.add(
        'wrong-kind',
        node.spot,
        key,
        `A "${kind}" on a table takes ${wanted === 'moves' ? 'moves' : 'states'}.`,
        tableForms,
      )
      return undefined
    }
    return subject
  }
  if (node.kind !== 'scalar') {
    reading.faults.add(
      'wrong-kind',
      node.spot,
      key,
      `This "${kind}" is no expression.`,
      'Lists and maps of states belong to a table.',
    )
    return undefined
  }
  const allowed = kind === 'frequency' ? { ...overState, transitions: true } : overState
  const of = expressionAt(reading, node, key, allowed)
  if (of === undefined) return undefined
  if (kind === 'frequency') {
    if (!mentionsTransition(of)) {
      reading.faults.add(
        'no-transition',
        of.at ?? node.spot,
        key,
        'A frequency counts firings, but no transition is named here.',
        suggestion(node.text, [...reading.scope.transitions.keys()]),
        node.text,
      )
      return undefined
    }
    if (!checkFirings(reading, of, node.spot, key)) return undefined
  }
  return { kind: 'expression', of }
}

const tableForms = 'Write [failed] for a share, { keen: 0, worn: 3 } for values, { from: worn, to: failed } for moves.'

const indices = new WeakMap<readonly string[], ReadonlyMap<string, number>>()

/** Index of a state by its name; worked out once a table, since it may have very many. */
function indexOfState(states: readonly string[], name: string): number | undefined {
  let known = indices.get(states)
  if (known === undefined) {
    known = new Map(states.map((each, i) => [each, i]))
    indices.set(states, known)
  }
  return known.get(name)
}

/** `[failed]`, `{ keen: 0, worn: 3 }` or `{ from: worn, to: failed }`. */
function tableSubject(reading: Reading, node: Located, key: string, states: readonly string[]): Subject | undefined {
  const { faults } = reading
  const indexOf = (name: string, spot: Spot): number | undefined => {
    const index = indexOfState(states, name.trim())
    if (index !== undefined) return index
    faults.add('unknown-state', spot, key, `"${name.slice(0, 60)}" is not a state.`, suggestion(name, states), name)
    return undefined
  }
  if (node.kind === 'list') {
    const values: Fraction[] = states.map(() => zero)
    for (const item of node.items) {
      const index = item.kind === 'scalar' ? indexOf(item.text, item.spot) : undefined
      if (index === undefined) return undefined
      values[index] = one
    }
    return { kind: 'states', values }
  }
  if (node.kind === 'scalar') {
    // One state may stand without brackets.
    const index = states.indexOf(node.text.trim())
    if (index >= 0) return { kind: 'states', values: states.map((_, i) => (i === index ? one : zero)) }
    faults.add(
      'not-table-form',
      node.spot,
      key,
      `"${node.text.slice(0, 60)}" can't be measured on a table.`,
      tableForms,
      node.text,
    )
    return undefined
  }
  const keys = node.entries.map((each) => each.key)
  if (
    keys.length > 0 &&
    keys.every((each) => each === 'from' || each === 'to') &&
    !keys.some((each) => states.includes(each))
  ) {
    const end = (which: string): number | undefined | 'faulty' => {
      const entry = entryOf(node, which)
      if (entry === undefined) return undefined
      return (entry.value.kind === 'scalar' ? indexOf(entry.value.text, entry.value.spot) : undefined) ?? 'faulty'
    }
    const from = end('from')
    const to = end('to')
    if (from === 'faulty' || to === 'faulty') return undefined
    return { kind: 'moves', ...(from === undefined ? {} : { from }), ...(to === undefined ? {} : { to }) }
  }
  const values: Fraction[] = states.map(() => zero)
  for (const { key: name, keySpot, value } of node.entries) {
    const index = indexOf(name, keySpot)
    const expression = expressionAt(reading, value, key, constantsOnly, true)
    const number = expression && constantValue(reading, expression, value.spot, key)
    if (index === undefined || number === undefined) return undefined
    values[index] = number
  }
  return { kind: 'states', values }
}
