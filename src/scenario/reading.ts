import type { Fraction } from '../numbers/fraction.js'
import { evaluateExactly, NoValue } from './evaluate-exactly.js'
import type { Expression, Spot } from './expression.js'
import { readSyntax } from './expression-syntax.js'
import type { FaultList } from './fault-list.js'
import { type Located, type LocatedEntry, type LocatedMap, type LocatedScalar, placeOf } from './located-yaml.js'
import { type Allowed, resolveNames, type Scope } from './resolve-names.js'
import { writtenNumber } from './written-number.js'

/** What is needed to read the parts of one file: its names so far, and where its faults go. */
export interface Reading {
  readonly scope: Scope
  readonly faults: FaultList
}

const noBound: ReadonlySet<string> = new Set()
export const constantsOnly: Allowed = { state: false, transitions: false, bound: noBound }
export const overState: Allowed = { state: true, transitions: false, bound: noBound }

export function entryOf(map: LocatedMap, key: string): LocatedEntry | undefined {
  const place = placeOf(map, key)
  return place === undefined ? undefined : map.entries[place]
}

/** The entries of a map under a key; none where it is absent, empty or no map (which the shape's check reports). */
export function entriesOf(map: LocatedMap, key: string): readonly LocatedEntry[] {
  const value = entryOf(map, key)?.value
  return value?.kind === 'map' ? value.entries : []
}

export function scalarOf(map: LocatedMap, key: string): LocatedScalar | undefined {
  const value = entryOf(map, key)?.value
  return value?.kind === 'scalar' && value.value !== null ? value : undefined
}

/**
 * An expression, its names looked up. `12 %` alone is a share where one can be meant.
 * @returns undefined where it is faulty, which has been reported, or not a scalar, which the shape's check has
 */
export function expressionAt(
  reading: Reading,
  node: Located,
  key: string,
  allowed: Allowed,
  percentages = false,
): Expression | undefined {
  if (node.kind !== 'scalar') return undefined
  if (percentages) {
    const written = writtenNumber(node.text)
    if (written?.percent) return { kind: 'number', value: written.value, at: node.spot }
  }
  return expressionOfText(reading, node.text, node.spotAt, key, allowed, node.inFlow && !node.quoted)
}

export function expressionOfText(
  { scope, faults }: Reading,
  text: string,
  spotAt: (offset: number) => Spot,
  key: string,
  allowed: Allowed,
  inBraces = false,
): Expression | undefined {
  const read = readSyntax(text)
  if ('fault' in read) {
    const { at, what, next } = read.fault
    const cut = inBraces && /[([]/.test(text) && next.includes('bracket')
    faults.add(
      'bad-expression',
      spotAt(at),
      key,
      what,
      cut ? 'In the one-line { } style a comma ends the text: put quotes around the expression.' : next,
      text,
    )
    return undefined
  }
  const before = faults.count
  const expression = resolveNames(read.syntax, scope, allowed, spotAt, (code, at, what, next, part) =>
    faults.add(code, at, key, what, next, part),
  )
  return faults.count > before ? undefined : expression
}

/** The exact value of an expression over constants; undefined (and reported) where it has none. */
export function constantValue(
  { scope, faults }: Reading,
  expression: Expression,
  spot: Spot,
  key: string,
  bound: ReadonlyMap<string, Fraction> = new Map(),
): Fraction | undefined {
  try {
    const value = evaluateExactly(expression, {
      constants: scope.constants,
      quantities: new Map(),
      variable: () => undefined,
      bound,
    })
    if (value === undefined) {
      faults.add(
        'not-exact',
        spot,
        key,
        'This value is not a whole number or a fraction.',
        'exp, log, sqrt, poisson and very long sums have no exact value here: write the number.',
      )
    }
    return value
  } catch (error) {
    if (!(error instanceof NoValue)) throw error
    faults.add('no-value', spot, key, error.message, error.next)
    return undefined
  }
}

/** A whole number over constants. */
export function wholeAt(reading: Reading, node: Located, key: string): number | undefined {
  const expression = expressionAt(reading, node, key, constantsOnly)
  if (expression === undefined) return undefined
  const value = constantValue(reading, expression, node.spot, key)
  if (value === undefined) return undefined
  const text = node.kind === 'scalar' ? node.text : ''
  if (value.denominator !== 1n) {
    reading.faults.add(
      'not-whole',
      node.spot,
      key,
      `"${text}" is ${value.numerator}/${value.denominator}, not a whole number.`,
      'State variables are whole numbers: use floor or ceil.',
      text,
    )
    return undefined
  }
  if (value.numerator > 2n ** 31n - 1n || value.numerator < -(2n ** 31n)) {
    reading.faults.add(
      'too-large',
      node.spot,
      key,
      `"${text}" is beyond the whole numbers that a state can hold.`,
      'Bounds and starts go from -2,147,483,648 to 2,147,483,647; leave a bound out where there is none.',
      text,
    )
    return undefined
  }
  return Number(value.numerator)
}
