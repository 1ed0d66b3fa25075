import type { z } from 'zod'
import type { Spot } from './expression.js'
import type { FaultList } from './fault-list.js'
import { scenarioSchema } from './format-schema.js'
import { type Located, type LocatedMap, placeOf } from './located-yaml.js'
import { nearest, suggestion } from './names.js'

/** Keys of the format that this version can't do yet, and what can be done in their place. */
const notYet: Readonly<Record<string, string>> = {
  delay:
    'This version has exponential clocks only: give the "rate" (one over the mean delay), or add a stage to the state.',
  copies: 'This version has exponential clocks only: multiply the "rate" by the number of clocks that run.',
  interrupted: 'This version has exponential clocks only, which have no memory: leave it out.',
  passage:
    'This version does not measure times between events: use average, share, frequency, ratio, quantile or distribution.',
}

/** Checks a file's tree against the schema and reports each difference at its place. */
export function checkShape(root: Located, faults: FaultList): void {
  if (root.kind !== 'map') {
    faults.add(
      'not-a-scenario',
      root.spot,
      '',
      'This is not a scenario: it has no keys.',
      'Begin with "stillmark: 1", "title:" and "time:".',
    )
    return
  }
  const result = scenarioSchema.safeParse(plain(root, 0))
  if (result.success) return
  for (const issue of result.error.issues) report(issue, root, faults)
}

/** As zod wants it: objects without a prototype, so that no key of a stranger means more than itself. */
function plain(node: Located, depth: number): unknown {
  if (node.kind === 'scalar') {
    const value = typeof node.value === 'bigint' ? Number(node.value) : node.value
    // What a double can't hold goes on as text, so that the message is about the number.
    return typeof value === 'number' && !Number.isFinite(value) ? node.text : value
  }
  if (node.kind === 'list') return node.items.map((item) => plain(item, depth + 1))
  const object: Record<string, unknown> = Object.create(null)
  for (const { key, value } of node.entries) {
    // An empty section of the file is no section.
    if (depth === 0 && value.kind === 'scalar' && value.value === null) continue
    object[key] = plain(value, depth + 1)
  }
  return object
}

type Issue = z.core.$ZodIssue

function report(issue: Issue, root: LocatedMap, faults: FaultList): void {
  const path = issue.path.map(String)
  const key = path.join('.')
  const { node, keySpot, found } = follow(root, path)
  if (issue.code === 'unrecognized_keys') {
    for (const unknown of issue.keys) reportUnknown(unknown, node, path, faults)
    return
  }
  const last = path[path.length - 1] ?? ''
  if (!found) {
    faults.add(
      'key-missing',
      keySpot,
      key,
      `"${last}" is missing${path.length > 1 ? ` in "${path[path.length - 2]}"` : ''}.`,
      missingNext(key),
    )
    return
  }
  const spot = node.spot
  const text = node.kind === 'scalar' ? node.text : ''
  if (issue.code === 'invalid_value') {
    const allowed = issue.values.map(String)
    if (key === 'stillmark') {
      faults.add(
        'unknown-format',
        spot,
        key,
        `Format "${text}" is not known.`,
        'This version reads "stillmark: 1".',
        text,
      )
      return
    }
    faults.add('not-allowed', spot, key, `"${text}" is not allowed for "${last}".`, suggestion(text, allowed), text)
    return
  }
  if (node.kind === 'scalar' && node.value === null) {
    faults.add('value-missing', spot, key, `"${last}" has no value.`, missingNext(key))
    return
  }
  faults.add(
    'wrong-kind',
    spot,
    key,
    `"${last}" is ${kindOf(node)}, which can't stand here.`,
    `It takes ${wanted(issue)}.`,
    text,
  )
}

function reportUnknown(unknown: string, node: Located, path: readonly string[], faults: FaultList): void {
  const place = node.kind === 'map' ? placeOf(node, unknown) : undefined
  const entry = node.kind === 'map' && place !== undefined ? node.entries[place] : undefined
  const spot = entry?.keySpot ?? node.spot
  const key = [...path, unknown].join('.')
  if (Object.hasOwn(notYet, unknown) && path.length === 2) {
    faults.add('not-in-this-version', spot, key, `"${unknown}" can't be used yet.`, notYet[unknown], unknown)
    return
  }
  // `source: capacity spreadsheet, cell F12` inside one-line braces: the comma has ended the text.
  const value = entry?.value
  const cutOff = value?.kind === 'scalar' && value.value === null && value.inFlow
  const before = node.kind === 'map' && place !== undefined ? node.entries[place - 1] : undefined
  if (cutOff && before?.value.kind === 'scalar' && /[ (]/.test(unknown + before.value.text)) {
    faults.add(
      'comma-in-braces',
      spot,
      key,
      `In the one-line { } style the comma ends the text: "${unknown}" is read as a key.`,
      `Put quotes around it: ${before.key}: "${before.value.text}, ${unknown}".`,
      unknown,
    )
    return
  }
  const allowed = allowedKeys(path)
  const near = nearest(unknown, allowed)
  faults.add(
    'unknown-key',
    spot,
    key,
    `"${unknown}" is not a key${path.length === 0 ? ' of a scenario' : ` of "${path[path.length - 1]}"`}.`,
    near === undefined ? suggestion(unknown, allowed) : `Did you mean "${near}"?`,
    unknown,
  )
}

/** Keys that the schema knows at a path. */
function allowedKeys(path: readonly string[]): readonly string[] {
  let schema: unknown = scenarioSchema
  for (const part of path) schema = inner(schema, part)
  const shape = (unwrapped(schema) as { shape?: Record<string, unknown> } | undefined)?.shape
  return shape === undefined ? [] : Object.keys(shape)
}

function unwrapped(schema: unknown): unknown {
  let current = schema as { unwrap?: () => unknown; def?: { type: string; options?: unknown[] } } | undefined
  while (current?.def?.type === 'optional' || current?.def?.type === 'nullable')
    current = current.unwrap?.() as typeof current
  if (current?.def?.type !== 'union') return current
  return current.def.options?.find((option) => (option as { def: { type: string } }).def.type === 'object') ?? current
}

function inner(schema: unknown, part: string): unknown {
  const current = unwrapped(schema) as {
    shape?: Record<string, unknown>
    def?: { valueType?: unknown; element?: unknown }
  }
  return current?.shape?.[part] ?? current?.def?.valueType ?? current?.def?.element
}

interface Followed {
  readonly node: Located
  /** Of the key that leads to the node, of the node above where there is none. */
  readonly keySpot: Spot
  readonly found: boolean
}

function follow(root: LocatedMap, path: readonly string[]): Followed {
  let node: Located = root
  let keySpot: Spot = root.spot
  for (const part of path) {
    if (node.kind === 'list') {
      const item: Located | undefined = node.items[Number(part)]
      if (item === undefined) return { node, keySpot, found: false }
      keySpot = item.spot
      node = item
      continue
    }
    const place: number | undefined = node.kind === 'map' ? placeOf(node, part) : undefined
    const entry: LocatedMap['entries'][number] | undefined =
      node.kind === 'map' && place !== undefined ? node.entries[place] : undefined
    if (entry === undefined) return { node, keySpot, found: false }
    keySpot = entry.keySpot
    node = entry.value
  }
  return { node, keySpot, found: true }
}

const kindOf = (node: Located): string =>
  node.kind === 'map' ? 'a map' : node.kind === 'list' ? 'a list' : `"${node.text.slice(0, 40)}"`

function wanted(issue: Issue): string {
  if (issue.code === 'invalid_type') {
    return (
      { string: 'a text', record: 'a map of names', object: 'a map', array: 'a list' }[issue.expected as string] ??
      `a ${issue.expected}`
    )
  }
  return 'a number, an expression, or the forms that the README shows'
}

const missingNext = (key: string): string =>
  ({
    stillmark: 'Begin the file with "stillmark: 1".',
    title: 'Say in a line what the model is about: "title: …".',
    time: 'Write "time: continuous" or "time: discrete".',
  })[key] ?? 'Write it, or take the key out.'
