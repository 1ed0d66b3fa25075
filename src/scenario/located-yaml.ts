import { isAlias, isMap, isPair, isScalar, isSeq, LineCounter, type Node, parseDocument, type Scalar } from 'yaml'
import type { Fault } from '../errors/stillmark-error.js'
import type { Spot } from './expression.js'

/** A YAML (or JSON) document as a tree in which every part knows where it stands. */
export type Located = LocatedMap | LocatedList | LocatedScalar

export interface LocatedMap {
  readonly kind: 'map'
  readonly spot: Spot
  readonly entries: readonly LocatedEntry[]
}

export interface LocatedEntry {
  readonly key: string
  readonly keySpot: Spot
  readonly value: Located
}

export interface LocatedList {
  readonly kind: 'list'
  readonly spot: Spot
  readonly items: readonly Located[]
}

export interface LocatedScalar {
  readonly kind: 'scalar'
  readonly spot: Spot
  /** As written for plain text and numbers, the content for quoted text; empty where nothing stands there. */
  readonly text: string
  readonly value: string | number | bigint | boolean | null
  readonly quoted: boolean
  /** Inside one-line braces or brackets, where commas and brackets end a plain text. */
  readonly inFlow: boolean
  /** Where the character at an offset of `text` stands. */
  readonly spotAt: (offset: number) => Spot
}

const places = new WeakMap<LocatedMap, ReadonlyMap<string, number>>()

/** Place of a key among a map's entries, or undefined; worked out once a map, since a file may hold very many. */
export function placeOf(map: LocatedMap, key: string): number | undefined {
  let known = places.get(map)
  if (known === undefined) {
    known = new Map(map.entries.map((entry, i) => [entry.key, i]))
    places.set(map, known)
  }
  return known.get(key)
}

/** Nesting that a scenario never needs; beyond it a file is not one. */
const deepest = 60

/** @returns the tree, or all that is wrong with the text as YAML */
export function readLocated(
  text: string,
):
  | { readonly root: Located; readonly faults: readonly [] }
  | { readonly root?: undefined; readonly faults: readonly Fault[] } {
  const nesting = nestingFault(text)
  if (nesting !== undefined) return { faults: [nesting] }
  const lines = new LineCounter()
  const spotOf = (offset: number): Spot => {
    const { line, col } = lines.linePos(offset)
    return { line: Math.max(line, 1), column: Math.max(col, 1) }
  }
  let document: ReturnType<typeof parseDocument>
  try {
    document = parseDocument(text, { lineCounter: lines, version: '1.2', uniqueKeys: false, prettyErrors: false })
  } catch (error) {
    if (!(error instanceof RangeError)) throw error
    return { faults: [{ code: 'nested-too-deeply', what: 'The file nests too deeply to be read.' }] }
  }
  if (document.errors.length > 0) {
    // One wrong bracket makes the parser stumble over all that follows: only its first fault is one of the writer's.
    const [first] = document.errors
    return { faults: [yamlFault(text, first.pos[0], first.message, spotOf)] }
  }

  const faults: Fault[] = []
  const scalarOf = (node: Scalar, inFlow: boolean): LocatedScalar => {
    const start = node.range?.[0] ?? 0
    const quoted = node.type === 'QUOTE_SINGLE' || node.type === 'QUOTE_DOUBLE'
    const block = node.type === 'BLOCK_LITERAL' || node.type === 'BLOCK_FOLDED'
    const value = node.value as LocatedScalar['value']
    const written = typeof value === 'string' ? value : (node.source ?? '')
    const spotAt = (offset: number): Spot => {
      if (quoted) return spotOf(start + 1 + offset)
      if (!block) return spotOf(start + offset)
      // A block's text starts on the next line and is indented: count line by line.
      const before = written.slice(0, offset).split('\n')
      const first = text.indexOf('\n', start) + 1
      const indent = /^[ ]*/.exec(text.slice(first))?.[0].length ?? 0
      const { line } = spotOf(first)
      return { line: line + before.length - 1, column: indent + before[before.length - 1].length + 1 }
    }
    return { kind: 'scalar', spot: spotOf(start), text: written, value, quoted: quoted || block, inFlow, spotAt }
  }
  const nothing = (offset: number, inFlow: boolean): LocatedScalar => ({
    kind: 'scalar', spot: spotOf(offset), text: '', value: null, quoted: false, inFlow, spotAt: () => spotOf(offset),
  }) // biome-ignore format: one line a thing
  const walk = (node: Node | null, offset: number, inFlow: boolean): Located => {
    if (node === null) return nothing(offset, inFlow)
    const start = node.range?.[0] ?? offset
    if (isAlias(node) || node.anchor !== undefined) {
      faults.push({
        code: 'no-aliases',
        where: spotOf(start),
        what: 'Anchors (&) and aliases (*) are not part of the format.',
        next: 'Write the value where it is meant, or name it under "constants".',
      })
      return nothing(start, inFlow)
    }
    if (node.tag !== undefined && !node.tag.startsWith('tag:yaml.org,2002:')) {
      faults.push({
        code: 'no-tags',
        where: spotOf(start),
        what: `The tag "${node.tag}" is not part of the format.`,
        next: 'Leave it out.',
      })
    }
    if (isScalar(node)) return scalarOf(node, inFlow)
    if (isSeq(node)) {
      const flow = inFlow || node.flow === true
      return {
        kind: 'list',
        spot: spotOf(start),
        items: node.items.map((item) => walk(item as Node | null, start, flow)),
      }
    }
    if (!isMap(node)) return nothing(start, inFlow)
    const flow = inFlow || node.flow === true
    const entries: LocatedEntry[] = []
    const seen = new Set<string>()
    for (const pair of node.items) {
      if (!isPair(pair)) continue
      const key = pair.key as Node | null
      const at = key?.range?.[0] ?? start
      if (!isScalar(key)) {
        faults.push({
          code: 'key-not-text',
          where: spotOf(at),
          what: 'A key must be a name, not a list or a map.',
          next: 'Put quotes around a key with brackets: "waiting[1]".',
        })
        continue
      }
      const name = typeof key.value === 'string' ? key.value : (key.source ?? String(key.value))
      // Looked up here: the parser's own check compares every key with every other.
      if (seen.has(name)) faults.push(keyTwice(text, spotOf(at)))
      seen.add(name)
      entries.push({
        key: name,
        keySpot: spotOf(at),
        value: walk(pair.value as Node | null, key.range?.[1] ?? at, flow),
      })
    }
    return { kind: 'map', spot: spotOf(start), entries }
  }
  const root = walk(document.contents as Node | null, 0, false)
  return faults.length > 0 ? { faults } : { root, faults: [] }
}

/** Brackets are counted before a parser recurses into them; quoted ones count too, which no scenario comes near. */
function nestingFault(text: string): Fault | undefined {
  let depth = 0
  let line = 1
  let lineStart = 0
  let indentSteps = 0
  let lastIndent = -1
  for (let i = 0; i < text.length; i++) {
    const c = text.charCodeAt(i)
    if (c === 10) {
      line++
      lineStart = i + 1
      const indent = /^ */.exec(text.slice(lineStart, lineStart + 2000))?.[0].length ?? 0
      indentSteps = indent > lastIndent ? indentSteps + 1 : indent === 0 ? 0 : indentSteps
      lastIndent = indent
    } else if (c === 91 || c === 123) depth++
    else if (c === 93 || c === 125) depth = Math.max(0, depth - 1)
    const dashes = i === lineStart && text.startsWith('- - - - - - - - ', i)
    if (depth > 4 * deepest || dashes) {
      return {
        code: 'nested-too-deeply',
        where: { line, column: i - lineStart + 1 },
        what: 'The file nests too deeply to be a scenario.',
        next: 'Look for a bracket that is not closed.',
      }
    }
  }
  return undefined
}

const lineAt = (text: string, line: number): string => text.split('\n', line)[line - 1] ?? ''

const keyTwice = (text: string, where: Spot): Fault => ({
  code: 'key-twice',
  where,
  text: lineAt(text, where.line).trim().slice(0, 80),
  what: 'This key stands here a second time.',
  next: 'Keep one of them.',
})

function yamlFault(text: string, offset: number, message: string, spotOf: (offset: number) => Spot): Fault {
  const where = spotOf(offset)
  const line = lineAt(text, where.line)
  const shown = line.trim().slice(0, 80)
  if (/call stack/i.test(message)) {
    return { code: 'nested-too-deeply', where, text: shown, what: 'The file nests too deeply to be a scenario.' }
  }
  if (/multiple documents/i.test(message)) {
    return {
      code: 'not-yaml',
      where,
      text: shown,
      what: 'A second document begins here.',
      next: 'A file holds one scenario: take the line "---" out, or make it two files.',
    }
  }
  const plain = message.split('\n')[0].replace(/\.$/, '')
  return {
    code: 'not-yaml',
    where,
    text: shown,
    what: `This is not valid YAML: ${lowerFirst(plain)}.`,
    next: /tabs/i.test(message)
      ? 'Indent with spaces.'
      : /[{[]/.test(line)
        ? 'In the one-line { } style text with commas or brackets needs quotes: { then: { "waiting[1]": "waiting[1] - 1" } }; on indented lines it does not.'
        : 'Check the indentation, the colons and the quotes of this line and the one before.',
  }
}

const lowerFirst = (text: string): string => text.charAt(0).toLowerCase() + text.slice(1)
