import { createHash } from 'node:crypto'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { Fraction } from '../numbers/fraction.js'
import { checkShape } from './check-shape.js'
import type { Expression } from './expression.js'
import { type FaultList, newFaultList } from './fault-list.js'
import { partsOf } from './firings.js'
import { type LocatedMap, readLocated } from './located-yaml.js'
import { nameFault, suggestion } from './names.js'
import { parseMeasures } from './parse-measures.js'
import { parseClaims, parseExpect, parseSimulation } from './parse-run.js'
import { parseTableBody, type ReadBeside } from './parse-table.js'
import { parseStateVariables, parseVariablesBody } from './parse-variables.js'
import { entriesOf, entryOf, expressionAt, overState, type Reading, scalarOf } from './reading.js'
import type { Scenario, StateVariable } from './scenario.js'
import { writtenNumber } from './written-number.js'

export interface ParseOptions {
  /** The name that messages give the file. */
  readonly file: string
  /** Constants overridden from outside, as written there. */
  readonly overrides?: ReadonlyMap<string, string>
  /** Reads a file of the scenario's folder; throws as `readFileSync` does. */
  readonly readBeside?: ReadBeside
  /** Of the file's bytes; by default of the text in UTF-8. */
  readonly sha256?: string
}

/** Faults of one file that are reported; beyond it the file is something else. */
const mostFaults = 100
/** Faults of files that are right, but too large to be worked on. */
const limits: ReadonlySet<string> = new Set(['too-many-copies', 'state-too-wide'])

/**
 * Reads and checks a scenario file's text. No file is touched but through `readBeside`.
 *
 * @throws StillmarkError with every fault of the file, in the order of its lines
 */
export function parseScenario(text: string, options: ParseOptions): Scenario {
  const { file, overrides = new Map<string, string>() } = options
  const faults = newFaultList(file)
  const { root, faults: yamlFaults } = readLocated(text)
  if (root === undefined) {
    throw new StillmarkError(yamlFaults.map((fault) => ({ ...fault, where: { file, ...fault.where } })))
  }
  checkShape(root, faults)
  if (root.kind !== 'map') throw failed(faults)
  const time = scalarOf(root, 'time')?.text === 'discrete' ? 'discrete' : 'continuous'
  const constants = parseConstants(root, overrides, faults)
  const names = new Map<string, string>([...constants.keys()].map((name) => [name, 'constant']))
  const declare = (section: string, kind: string) => {
    for (const { key, keySpot } of entriesOf(root, section)) {
      const fault = nameFault(key)
      const other = names.get(key)
      if (fault !== undefined) faults.add('bad-name', keySpot, `${section}.${key}`, fault.what, fault.next, key)
      else if (other !== undefined) {
        faults.add(
          'name-twice',
          keySpot,
          `${section}.${key}`,
          `"${key}" is the name of a ${other} already.`,
          'Names are unique over constants, quantities, state and transitions.',
          key,
        )
      } else names.set(key, kind)
    }
  }
  declare('quantities', 'quantity')
  declare('state', 'state variable')
  declare('transitions', 'transition')
  for (const { key, keySpot } of entriesOf(root, 'measures')) {
    const fault = nameFault(key)
    if (fault !== undefined) faults.add('bad-name', keySpot, `measures.${key}`, fault.what, fault.next, key)
  }
  const constantScope = { constants, quantities: new Set<string>(), variables: new Map(), transitions: new Map() }
  const variables = parseStateVariables({ scope: constantScope, faults }, root)
  const reading: Reading = {
    scope: {
      constants,
      quantities: new Set(entriesOf(root, 'quantities').map((each) => each.key)),
      variables: namedVariables(root, variables),
      transitions: new Map(
        entriesOf(root, 'transitions').map((each) => [
          each.key,
          each.value.kind === 'map' ? entriesOf(each.value, 'each').length : 0,
        ]),
      ),
    },
    faults,
  }
  const quantities = parseQuantities(reading, root)
  const byTable = ['states', 'probabilities', 'rates', 'matrix'].some((key) => entryOf(root, key) !== undefined)
  checkOneBody(root, byTable, time, faults)
  const body = byTable
    ? parseTableBody(reading, root, time, options.readBeside ?? refuseFiles)
    : parseVariablesBody(reading, root, variables, time)
  const measures = parseMeasures(reading, root, body?.kind === 'table' ? body.states : byTable ? [] : undefined)
  const claims = parseClaims(reading, root, measures)
  const simulation = parseSimulation(reading, root)
  const expect = parseExpect(root)
  if (faults.count > 0 || body === undefined) throw failed(faults)
  return {
    source: { file, sha256: options.sha256 ?? createHash('sha256').update(text).digest('hex'), text, overrides },
    title: scalarOf(root, 'title')?.text ?? '',
    time,
    unit: scalarOf(root, 'unit')?.text ?? (time === 'continuous' ? 'time unit' : 'step'),
    constants,
    quantities,
    body,
    measures,
    claims,
    simulation,
    ...(expect === undefined ? {} : { expect }),
  }
}

const refuseFiles: ReadBeside = () => {
  throw Object.assign(new Error('no folder'), { code: 'ENOENT' })
}

function failed(faults: FaultList): StillmarkError {
  const all = faults.sorted()
  const shown = all.slice(0, mostFaults)
  if (shown.length === 0) return new StillmarkError({ code: 'not-a-scenario', what: 'This is not a scenario.' })
  return new StillmarkError(shown, shown.every(({ code }) => limits.has(code)) ? 'limit' : 'input')
}

/** Arrays keep their range although their bounds may be faulty, so that no index is told off for it. */
function namedVariables(
  root: LocatedMap,
  variables: readonly StateVariable[],
): Map<string, { readonly index?: { readonly from: number; readonly to: number } }> {
  const named = new Map<string, { readonly index?: { readonly from: number; readonly to: number } }>()
  const byName = new Map(variables.map((each) => [each.name, each]))
  for (const { key, value } of entriesOf(root, 'state')) {
    const known = byName.get(key)
    const array = value.kind === 'map' && entryOf(value, 'index') !== undefined
    const anyIndex = { from: -(2 ** 31), to: 2 ** 31 }
    named.set(key, known ?? (array ? { index: anyIndex } : {}))
  }
  return named
}

function parseConstants(
  root: LocatedMap,
  overrides: ReadonlyMap<string, string>,
  faults: FaultList,
): Map<string, Fraction | readonly Fraction[]> {
  const constants = new Map<string, Fraction | readonly Fraction[]>()
  for (const { key, keySpot, value } of entriesOf(root, 'constants')) {
    const fault = nameFault(key)
    if (fault !== undefined) faults.add('bad-name', keySpot, `constants.${key}`, fault.what, fault.next, key)
    const items = value.kind === 'list' ? value.items : [value]
    const numbers = items.map((item) => {
      if (item.kind !== 'scalar') return undefined
      const written = writtenNumber(item.text)
      if (written === undefined) {
        const formula = /[A-Za-z]/.test(item.text) && !/^[+-]?\.?(?:\d[\w.]*(?:e[+-]?\d+)?|inf|nan)$/i.test(item.text)
        faults.add(
          'not-a-number',
          item.spot,
          `constants.${key}`,
          `"${item.text.slice(0, 60)}" is not a number.`,
          formula
            ? 'A constant is a number; a formula belongs under "quantities".'
            : 'Write 12, 0.5, 1e-3, 1/3 or 2.5 %, with exponents from -400 to 400.',
          item.text,
        )
      }
      return written?.value
    })
    if (value.kind === 'list' && items.length === 0) {
      faults.add(
        'empty-list',
        value.spot,
        `constants.${key}`,
        `The list "${key}" is empty.`,
        'Give it at least one number.',
      )
    }
    const known = numbers.map((number) => number ?? { numerator: 1n, denominator: 1n })
    constants.set(key, value.kind === 'list' ? known : known[0])
  }
  for (const [name, text] of overrides) {
    const old = constants.get(name)
    if (old === undefined) {
      faults.add(
        'unknown-constant',
        undefined,
        `--set ${name}`,
        `There is no constant "${name}" to set.`,
        suggestion(name, [...constants.keys()]),
        text,
      )
      continue
    }
    const list = /^\s*\[(.*)\]\s*$/s.exec(text)
    const numbers = (list === null ? [text] : list[1].split(',')).map((part) => writtenNumber(part)?.value)
    if (numbers.some((number) => number === undefined)) {
      faults.add(
        'not-a-number',
        undefined,
        `--set ${name}`,
        `"${text.slice(0, 60)}" is not a number.`,
        list === null && !Array.isArray(old)
          ? `Write --set ${name}=12, 0.5, 1/3 or 2.5%.`
          : `Write --set '${name}=[1.2, 0.9]'.`,
        text,
      )
      continue
    }
    if (Array.isArray(old) !== (list !== null)) {
      faults.add(
        'list-or-number',
        undefined,
        `--set ${name}`,
        `"${name}" is ${Array.isArray(old) ? 'a list' : 'one number'} in the file.`,
        Array.isArray(old) ? `Write --set '${name}=[1.2, 0.9]'.` : `Write --set ${name}=12.`,
        text,
      )
      continue
    }
    const known = numbers as Fraction[]
    constants.set(name, list === null ? known[0] : known)
  }
  return constants
}

function parseQuantities(reading: Reading, root: LocatedMap): Map<string, Expression> {
  const quantities = new Map<string, Expression>()
  for (const { key, value } of entriesOf(root, 'quantities')) {
    const expression = expressionAt(reading, value, `quantities.${key}`, overState)
    if (expression !== undefined) quantities.set(key, expression)
  }
  const uses = new Map([...quantities].map(([name, expression]) => [name, quantitiesIn(expression)]))
  const suspects = neverEnding(uses)
  for (const { key, value } of entriesOf(root, 'quantities')) {
    const circle = suspects.has(key) && reading.faults.count < mostFaults ? circleFrom(key, uses) : undefined
    if (circle === undefined) continue
    reading.faults.add(
      'circle',
      value.spot,
      `quantities.${key}`,
      `"${key}" is defined by itself: ${shownCircle(circle)}.`,
      'Take one of them out of the circle.',
    )
  }
  return quantities
}

const shownCircle = (circle: readonly string[]): string =>
  (circle.length > 9 ? [...circle.slice(0, 6), '…', ...circle.slice(-2)] : circle).join(' → ')

/** Quantities that can't be worked out one after the other: those in a circle, and those that use one. */
function neverEnding(uses: ReadonlyMap<string, ReadonlySet<string>>): ReadonlySet<string> {
  const usedBy = new Map<string, string[]>([...uses.keys()].map((name) => [name, []]))
  const open = new Map<string, number>()
  for (const [name, used] of uses) {
    const known = [...used].filter((each) => uses.has(each))
    open.set(name, known.length)
    for (const each of known) usedBy.get(each)?.push(name)
  }
  const ready = [...open].filter(([, count]) => count === 0).map(([name]) => name)
  const left = new Set(uses.keys())
  for (let name = ready.pop(); name !== undefined; name = ready.pop()) {
    left.delete(name)
    for (const user of usedBy.get(name) ?? []) {
      const count = (open.get(user) ?? 0) - 1
      open.set(user, count)
      if (count === 0) ready.push(user)
    }
  }
  return left
}

/** The way by which a quantity leads back to itself, or undefined. Each quantity is visited once. */
function circleFrom(start: string, uses: ReadonlyMap<string, ReadonlySet<string>>): readonly string[] | undefined {
  const cameFrom = new Map<string, string>()
  const rest = [start]
  for (let name = rest.pop(); name !== undefined; name = rest.pop()) {
    for (const next of uses.get(name) ?? []) {
      if (next === start) {
        const back = [start]
        for (let at: string | undefined = name; at !== undefined; at = cameFrom.get(at)) back.push(at)
        return back.reverse()
      }
      if (cameFrom.has(next)) continue
      cameFrom.set(next, name)
      rest.push(next)
    }
  }
  return undefined
}

function quantitiesIn(expression: Expression): ReadonlySet<string> {
  const found = new Set<string>()
  const rest: Expression[] = [expression]
  for (let part = rest.pop(); part !== undefined; part = rest.pop()) {
    if (part.kind === 'quantity') found.add(part.name)
    rest.push(...partsOf(part))
  }
  return found
}

function checkOneBody(root: LocatedMap, byTable: boolean, time: 'continuous' | 'discrete', faults: FaultList): void {
  const remainder = entryOf(root, 'remainder')
  if (remainder !== undefined && time === 'continuous') {
    faults.add(
      'no-remainder',
      remainder.keySpot,
      'remainder',
      'In continuous time there is no rest of a probability.',
      'Leave "remainder" out.',
    )
  }
  if (byTable) {
    for (const section of ['state', 'transitions', 'quantities']) {
      const entry = entryOf(root, section)
      if (entry !== undefined && entriesOf(root, section).length > 0) {
        faults.add(
          'two-bodies',
          entry.keySpot,
          section,
          `A chain by table has no "${section}".`,
          'Give either a table, or state variables and transitions.',
        )
      }
    }
    return
  }
  const start = entryOf(root, 'start')
  if (start !== undefined)
    faults.add(
      'start-alone',
      start.keySpot,
      'start',
      '"start" at the top level belongs to a table.',
      'Give each state variable a "start".',
    )
  for (const section of ['state', 'transitions']) {
    if (entriesOf(root, section).length === 0 && entryOf(root, section)?.value.kind !== 'list') {
      faults.add(
        'key-missing',
        entryOf(root, section)?.keySpot ?? root.spot,
        section,
        `"${section}" is missing.`,
        section === 'state'
          ? 'Declare at least one state variable, or give the chain by table.'
          : 'Declare at least one transition.',
      )
    }
  }
}
