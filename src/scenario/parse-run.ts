import { compare, one, sign, toNumber } from '../numbers/fraction.js'
import { expectations } from './format-schema.js'
import type { LocatedMap } from './located-yaml.js'
import { suggestion } from './names.js'
import { entriesOf, entryOf, type Reading, scalarOf } from './reading.js'
import type { Claim, Expectation, Measure, SimulationSettings, Tolerance } from './scenario.js'
import { warmUpRules } from './warm-up-rules.js'
import { writtenNumber } from './written-number.js'

export function parseClaims(reading: Reading, root: LocatedMap, measures: readonly Measure[]): Claim[] {
  const { faults } = reading
  const claims: Claim[] = []
  // A measure that is faulty itself is there all the same: the claim about it is not told off for it.
  const named = entriesOf(root, 'measures').map((each) => each.key)
  for (const { key: name, keySpot, value: map } of entriesOf(root, 'claims')) {
    const key = `claims.${name}`
    if (!named.includes(name)) {
      faults.add(
        'unknown-measure',
        keySpot,
        key,
        `There is no measure "${name}" to claim something about.`,
        suggestion(name, named),
        name,
      )
      continue
    }
    if (measures.find((each) => each.name === name)?.kind === 'distribution') {
      faults.add(
        'claim-on-distribution',
        keySpot,
        key,
        `"${name}" is a distribution, which has no single value.`,
        'Claim a share, an average or a quantile.',
      )
      continue
    }
    if (map.kind !== 'map') continue
    const node = scalarOf(map, 'value')
    if (node === undefined) continue
    const written = writtenNumber(node.text)
    if (written === undefined) {
      faults.add(
        'not-a-number',
        node.spot,
        `${key}.value`,
        `"${node.text.slice(0, 40)}" is not a number.`,
        'Write 0.115, 11.5 % or 3/26.',
        node.text,
      )
      continue
    }
    const tolerance =
      entryOf(map, 'tolerance') === undefined ? undefined : parseTolerance(reading, map, `${key}.tolerance`)
    const source = scalarOf(map, 'source')
    claims.push({
      measure: name,
      value: written.value,
      written: node.text.trim(),
      ...(tolerance === undefined ? {} : { tolerance }),
      lastDigit: written.lastDigit,
      ...(source === undefined ? {} : { source: source.text }),
      at: keySpot,
    })
  }
  return claims
}

/** A percentage is relative, a plain number absolute. */
function parseTolerance(reading: Reading, map: LocatedMap, key: string): Tolerance | undefined {
  const node = scalarOf(map, 'tolerance')
  if (node === undefined) return undefined
  const written = writtenNumber(node.text)
  if (written === undefined || sign(written.value) <= 0) {
    reading.faults.add(
      'bad-tolerance',
      node.spot,
      key,
      `"${node.text.slice(0, 40)}" is no tolerance.`,
      'Write 2 % (of the exact value) or a number above 0 in the unit of the measure.',
      node.text,
    )
    return undefined
  }
  return { kind: written.percent ? 'relative' : 'absolute', value: written.value }
}

export function parseSimulation(reading: Reading, root: LocatedMap): SimulationSettings {
  const { faults } = reading
  const map = entryOf(root, 'simulation')?.value
  if (map?.kind !== 'map') return {}
  const number = (key: string, holds: (value: number) => boolean, next: string): number | undefined => {
    const node = scalarOf(map, key)
    if (node === undefined) return undefined
    const written = writtenNumber(node.text)
    const value = written === undefined ? Number.NaN : toNumber(written.value)
    if (written?.percent || !Number.isFinite(value) || !holds(value)) {
      faults.add(
        'bad-setting',
        node.spot,
        `simulation.${key}`,
        `"${node.text.slice(0, 40)}" can't be the "${key}".`,
        next,
        node.text,
      )
      return undefined
    }
    return value
  }
  const replications = number(
    'replications',
    (value) => Number.isInteger(value) && value >= 1 && value <= 1e6,
    'A whole number from 1 to 1,000,000; 16 is the default.',
  )
  const runLength = number('run-length', (value) => value > 0, 'A number of time units above 0.')
  const tolerance = parseTolerance(reading, map, 'simulation.tolerance')
  const confidence = parseConfidence(reading, map)
  const warmUp = parseWarmUp(reading, map)
  const seed = scalarOf(map, 'seed')
  return {
    ...(seed === undefined ? {} : { seed: seed.text }),
    ...(replications === undefined ? {} : { replications }),
    ...(runLength === undefined ? {} : { runLength }),
    ...(warmUp === undefined ? {} : { warmUp }),
    ...(confidence === undefined ? {} : { confidence }),
    ...(tolerance === undefined ? {} : { tolerance }),
  }
}

function parseConfidence(reading: Reading, map: LocatedMap): number | undefined {
  const node = scalarOf(map, 'confidence')
  if (node === undefined) return undefined
  const written = writtenNumber(node.text)
  if (written !== undefined && sign(written.value) > 0 && compare(written.value, one) < 0)
    return toNumber(written.value)
  const meant =
    written !== undefined && !written.percent && toNumber(written.value) < 100 && toNumber(written.value) > 1
  reading.faults.add(
    'bad-setting',
    node.spot,
    'simulation.confidence',
    `"${node.text.slice(0, 40)}" can't be a confidence.`,
    meant ? `Did you mean ${node.text} %?` : 'It lies between 0 and 1: 0.95 or 95 %.',
    node.text,
  )
  return undefined
}

function parseWarmUp(reading: Reading, map: LocatedMap): SimulationSettings['warmUp'] {
  const node = scalarOf(map, 'warm-up')
  if (node === undefined) return undefined
  const written = writtenNumber(node.text)
  if (written !== undefined && !written.percent && sign(written.value) >= 0) return toNumber(written.value)
  const word = node.text.trim()
  if (written === undefined && (warmUpRules as readonly string[]).includes(word)) return word
  reading.faults.add(
    'bad-setting',
    node.spot,
    'simulation.warm-up',
    `"${word.slice(0, 40)}" can't be the "warm-up".`,
    `Write auto, a length in time units of 0 or more, or the name of a rule (${warmUpRules.slice(1).join(', ')}).`,
    node.text,
  )
  return undefined
}

export function parseExpect(root: LocatedMap): Expectation | undefined {
  const text = scalarOf(root, 'expect')?.text.trim()
  return expectations.find((each) => each === text)
}
