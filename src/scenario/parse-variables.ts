import { type Fraction, fraction } from '../numbers/fraction.js'
import type { Expression, Spot } from './expression.js'
import type { Located, LocatedEntry, LocatedMap } from './located-yaml.js'
import { nameFault, suggestion } from './names.js'
import {
  constantsOnly,
  constantValue,
  entriesOf,
  entryOf,
  expressionAt,
  expressionOfText,
  type Reading,
  wholeAt,
} from './reading.js'
import type { StateVariable, TransitionRule, VariablesBody } from './scenario.js'

/** Integers that a state may have in all, and copies that its transitions may make. */
const mostElements = 10_000
const mostCopies = 1_000_000

export function parseStateVariables(reading: Reading, root: LocatedMap): StateVariable[] {
  const variables: StateVariable[] = []
  let elements = 0
  for (const { key: name, keySpot, value } of entriesOf(root, 'state')) {
    if (value.kind !== 'map') continue
    const variable = parseVariable(reading, name, keySpot, value)
    if (variable === undefined) continue
    elements += variable.start.length
    if (elements > mostElements) {
      reading.faults.add(
        'state-too-wide',
        keySpot,
        `state.${name}`,
        `The state has more than ${mostElements.toLocaleString('en-US')} integers.`,
        'Make the arrays shorter.',
      )
      return variables
    }
    variables.push(variable)
  }
  return variables
}

function parseVariable(reading: Reading, name: string, at: Spot, map: LocatedMap): StateVariable | undefined {
  const { faults } = reading
  const key = `state.${name}`
  const whole = (
    from: LocatedMap,
    part: string,
    address: string,
  ): { readonly value?: number; readonly ok: boolean; readonly spot: Spot } => {
    const entry = entryOf(from, part)
    if (entry === undefined) return { ok: true, spot: at }
    const value = wholeAt(reading, entry.value, `${address}.${part}`)
    return { value, ok: value !== undefined, spot: entry.value.spot }
  }
  const low = whole(map, 'from', key)
  const high = whole(map, 'to', key)
  let index: StateVariable['index']
  let length = 1
  const indexMap = entryOf(map, 'index')?.value
  if (indexMap?.kind === 'map') {
    const from = whole(indexMap, 'from', `${key}.index`)
    const to = whole(indexMap, 'to', `${key}.index`)
    if (from.value === undefined || to.value === undefined) return undefined
    if (from.value > to.value) {
      faults.add(
        'empty-index',
        to.spot,
        `${key}.index`,
        `The index of "${name}" goes from ${from.value} to ${to.value}: the array has no element.`,
        'Let "to" be at least "from".',
      )
      return undefined
    }
    index = { from: from.value, to: to.value }
    length = to.value - from.value + 1
    if (length > mostElements) {
      faults.add(
        'state-too-wide',
        to.spot,
        `${key}.index`,
        `The array "${name}" has ${length.toLocaleString('en-US')} elements.`,
        `At most ${mostElements.toLocaleString('en-US')} are possible.`,
      )
      return undefined
    }
  }
  if (!low.ok || !high.ok) return undefined
  if (low.value !== undefined && high.value !== undefined && low.value > high.value) {
    faults.add(
      'bounds-crossed',
      high.spot,
      `${key}.to`,
      `"${name}" goes from ${low.value} to ${high.value}: no value is possible.`,
      'Let "to" be at least "from".',
    )
    return undefined
  }
  const starts = parseStart(
    reading,
    entryOf(map, 'start')?.value,
    key,
    length,
    low.value ?? (high.value !== undefined && high.value < 0 ? high.value : 0),
  )
  if (starts === undefined) return undefined
  for (const { value, spot } of starts) {
    if ((low.value !== undefined && value < low.value) || (high.value !== undefined && value > high.value)) {
      const range = `${low.value ?? 'no lower bound'} to ${high.value ?? 'no upper bound'}`
      faults.add(
        'start-outside',
        spot ?? at,
        `${key}.start`,
        `"${name}" starts at ${value}, outside its bounds ${range}.`,
        'Start inside, or widen the bounds.',
      )
      return undefined
    }
  }
  return {
    name,
    ...(index === undefined ? {} : { index }),
    ...(low.value === undefined ? {} : { from: low.value }),
    ...(high.value === undefined ? {} : { to: high.value }),
    start: starts.map((each) => each.value),
    at,
  }
}

function parseStart(
  reading: Reading,
  node: Located | undefined,
  key: string,
  length: number,
  otherwise: number,
): readonly { readonly value: number; readonly spot?: Spot }[] | undefined {
  if (node === undefined) return Array.from({ length }, () => ({ value: otherwise }))
  if (node.kind === 'scalar') {
    const value = wholeAt(reading, node, `${key}.start`)
    return value === undefined ? undefined : Array.from({ length }, () => ({ value, spot: node.spot }))
  }
  if (node.kind !== 'list') return undefined
  if (node.items.length !== length) {
    reading.faults.add(
      'start-length',
      node.spot,
      `${key}.start`,
      `The start has ${node.items.length} values for ${length} ${length === 1 ? 'element' : 'elements'}.`,
      'Give one value for all, or one for each element.',
    )
    return undefined
  }
  const values = node.items.map((item) => ({ value: wholeAt(reading, item, `${key}.start`), spot: item.spot }))
  return values.every((each): each is { value: number; spot: Spot } => each.value !== undefined) ? values : undefined
}

export function parseVariablesBody(
  reading: Reading,
  root: LocatedMap,
  variables: readonly StateVariable[],
  time: 'continuous' | 'discrete',
): VariablesBody {
  const transitions: TransitionRule[] = []
  for (const entry of entriesOf(root, 'transitions')) {
    const rule = parseTransition(reading, entry, time)
    if (rule !== undefined) transitions.push(rule)
  }
  return {
    kind: 'variables',
    variables,
    transitions,
    remainder: entryOf(root, 'remainder') === undefined ? 'refuse' : 'stay',
  }
}

function parseTransition(
  reading: Reading,
  { key: name, keySpot, value }: LocatedEntry,
  time: 'continuous' | 'discrete',
): TransitionRule | undefined {
  if (value.kind !== 'map') return undefined
  const { faults } = reading
  const key = `transitions.${name}`
  const each = parseEach(reading, value, key)
  const allowed = { state: true, transitions: false, bound: new Set(each.map((one) => one.name)) }
  const when = entryOf(value, 'when')
  const condition: Expression | undefined =
    when === undefined ? { kind: 'truth', value: true } : expressionAt(reading, when.value, `${key}.when`, allowed)
  const wanted = time === 'continuous' ? 'rate' : 'probability'
  const other = time === 'continuous' ? 'probability' : 'rate'
  const misused = entryOf(value, other)
  if (misused !== undefined) {
    faults.add(
      'wrong-clock',
      misused.keySpot,
      `${key}.${other}`,
      `"${name}" has a "${other}", but time is ${time}.`,
      `Write "${wanted}", or change "time".`,
    )
  }
  const entry = entryOf(value, wanted)
  const later = ['delay', 'copies', 'interrupted'].some((part) => entryOf(value, part) !== undefined)
  if (entry === undefined && misused === undefined && !later) {
    faults.add(
      'key-missing',
      keySpot,
      `${key}.${wanted}`,
      `The transition "${name}" has no "${wanted}".`,
      time === 'continuous'
        ? 'Say how often it fires: "rate: 2".'
        : 'Say how likely it is in a step: "probability: 1/3".',
    )
  }
  const rate = entry === undefined ? undefined : expressionAt(reading, entry.value, `${key}.${wanted}`, allowed, true)
  const then = parseThen(reading, value, key, allowed)
  if (condition === undefined || rate === undefined || then === undefined) return undefined
  return { name, each, when: condition, rate, then, at: keySpot }
}

function parseEach(reading: Reading, map: LocatedMap, key: string): TransitionRule['each'] {
  const { scope, faults } = reading
  const each: { name: string; from: Expression; to: Expression }[] = []
  let copies = 1
  for (const { key: name, keySpot, value } of entriesOf(map, 'each')) {
    const address = `${key}.each.${name}`
    const fault = nameFault(name)
    if (fault !== undefined) faults.add('bad-name', keySpot, address, fault.what, fault.next, name)
    const hidden =
      scope.constants.has(name) ||
      scope.quantities.has(name) ||
      scope.variables.has(name) ||
      scope.transitions.has(name)
    if (hidden)
      faults.add(
        'name-hidden',
        keySpot,
        address,
        `"${name}" is a name already, and "each" may not hide it.`,
        'Choose another name.',
        name,
      )
    if (value.kind !== 'map') continue
    const bound = new Set(each.map((one) => one.name))
    const part = (which: 'from' | 'to') => {
      const entry = entryOf(value, which)
      return entry && expressionAt(reading, entry.value, `${address}.${which}`, { ...constantsOnly, bound })
    }
    const from = part('from')
    const to = part('to')
    if (from === undefined || to === undefined) continue
    each.push({ name, from, to })
    if (usesBound(from) || usesBound(to)) continue
    const first = constantValue(reading, from, value.spot, address)
    const last = constantValue(reading, to, value.spot, address)
    if (first === undefined || last === undefined) continue
    if (first.denominator !== 1n || last.denominator !== 1n) {
      faults.add(
        'not-whole',
        value.spot,
        address,
        `"${name}" does not go from a whole number to a whole number.`,
        'Use floor or ceil.',
      )
      continue
    }
    copies *= Math.max(0, Number(last.numerator - first.numerator) + 1)
    if (copies > mostCopies) {
      faults.add(
        'too-many-copies',
        value.spot,
        address,
        `"each" makes more than ${mostCopies.toLocaleString('en-US')} copies of the transition.`,
        'Make the range shorter.',
      )
    }
  }
  return each
}

const usesBound = (expression: Expression): boolean =>
  JSON.stringify(expression, (_, part) => (typeof part === 'bigint' ? `${part}` : part)).includes('"kind":"bound"')

function parseThen(
  reading: Reading,
  map: LocatedMap,
  key: string,
  allowed: typeof constantsOnly,
): TransitionRule['then'] | undefined {
  const { scope, faults } = reading
  const entry = entryOf(map, 'then')
  if (entry === undefined) {
    faults.add(
      'key-missing',
      map.spot,
      `${key}.then`,
      'The transition has no "then".',
      'Say what it changes; "then: {}" where it changes nothing.',
    )
    return undefined
  }
  if (entry.value.kind !== 'map') return entry.value.kind === 'scalar' && entry.value.value === null ? [] : undefined
  const then: { variable: string; index?: Expression; value: Expression }[] = []
  const written = new Map<string, Spot>()
  for (const { key: target, keySpot, value } of entry.value.entries) {
    const address = `${key}.then.${target}`
    const right = expressionAt(reading, value, address, allowed)
    const match = /^\s*([A-Za-z][A-Za-z0-9_]*)\s*(?:\[(.*)\])?\s*$/s.exec(target)
    const name = match?.[1] ?? target
    const variable = scope.variables.get(name)
    if (match === null || variable === undefined) {
      const known = scope.constants.has(name)
        ? ' It is a constant, which does not change.'
        : scope.quantities.has(name)
          ? ' It is a quantity, which follows from the state.'
          : ''
      faults.add(
        'not-a-variable',
        keySpot,
        address,
        `"${target.slice(0, 60)}" is not a state variable.${known}`,
        suggestion(name, [...scope.variables.keys()]),
        target,
      )
      continue
    }
    if (variable.index === undefined && match[2] !== undefined) {
      faults.add('no-index', keySpot, address, `The variable "${name}" is no array.`, `Write "${name}".`, target)
      continue
    }
    if (variable.index !== undefined && match[2] === undefined) {
      faults.add(
        'index-missing',
        keySpot,
        address,
        `The variable "${name}" is an array: one element is written at a time.`,
        `Write "${name}[${variable.index.from}]".`,
        target,
      )
      continue
    }
    const offset = target.indexOf('[') + 1
    const index =
      match[2] === undefined
        ? undefined
        : expressionOfText(
            reading,
            match[2],
            (at) => ({ line: keySpot.line, column: keySpot.column + offset + at }),
            address,
            allowed,
          )
    if (match[2] !== undefined && index === undefined) continue
    if (index !== undefined && !checkConstantIndex(reading, index, variable.index, name, keySpot, address)) continue
    const element = target.replace(/\s+/g, '')
    if (written.has(element)) {
      faults.add(
        'written-twice',
        keySpot,
        address,
        `"${element}" is written twice by one transition.`,
        'Write it once.',
        target,
      )
      continue
    }
    written.set(element, keySpot)
    if (right !== undefined) then.push({ variable: name, ...(index === undefined ? {} : { index }), value: right })
  }
  return then
}

function checkConstantIndex(
  reading: Reading,
  index: Expression,
  range: { readonly from: number; readonly to: number } | undefined,
  name: string,
  spot: Spot,
  key: string,
): boolean {
  if (index.kind !== 'number' || range === undefined) return true
  const inside = (value: Fraction) =>
    value.denominator === 1n &&
    value.numerator >= fraction(range.from).numerator &&
    value.numerator <= fraction(range.to).numerator
  if (inside(index.value)) return true
  reading.faults.add(
    'index-outside',
    spot,
    key,
    `"${name}" has no element ${Number(index.value.numerator) / Number(index.value.denominator)}.`,
    `Its elements are ${range.from} to ${range.to}.`,
  )
  return false
}
