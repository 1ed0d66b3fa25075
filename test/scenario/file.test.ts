import { readFileSync } from 'node:fs'
import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { StillmarkError } from '../../src/errors/stillmark-error.js'
import { type Fraction, toText } from '../../src/numbers/fraction.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'
import type { TableBody, VariablesBody } from '../../src/scenario/scenario.js'

const lockers = readFileSync('scenarios/parcel-lockers.yaml', 'utf8')

/** "line:column code" of every fault, in order. */
function faultsOf(text: string, readBeside?: (name: string) => string): string[] {
  try {
    parseScenario(text, { file: 'f.yaml', readBeside })
    return []
  } catch (error) {
    if (!(error instanceof StillmarkError)) throw error
    return error.faults.map(({ code, where }) => `${where?.line ?? '-'}:${where?.column ?? '-'} ${code}`)
  }
}

const variables = (lines: string, time = 'continuous') => `stillmark: 1
title: t
time: ${time}
constants: { a: 2, list: [1.5, 1/3] }
state: { n: { from: 0, to: 5 } }
transitions:
${lines}
`
const table = (lines: string, time = 'discrete') => `stillmark: 1
title: t
time: ${time}
states: [keen, worn, failed]
${lines}
`

describe('what a file says is kept as it says it', () => {
  test('the parcel lockers', () => {
    const scenario = parseScenario(lockers, { file: 'lockers.yaml' })
    const body = scenario.body as VariablesBody
    expect(scenario).toMatchObject({ title: 'Parcel lockers at a commuter station', time: 'continuous', unit: 'hour' })
    expect(toText(scenario.constants.get('dwell') as Fraction)).toBe('5/2')
    expect(body.variables).toMatchObject([{ name: 'occupied', from: 0, to: 24, start: [0] }])
    expect(body.transitions.map((rule) => rule.name)).toEqual(['deposit', 'turned_away', 'collect'])
    expect(scenario.measures.map(({ name, kind }) => `${name} ${kind}`)).toEqual([
      'mean_occupied average',
      'full share',
      'deposits frequency',
      'lost_fraction ratio',
      'occupied_p95 quantile',
    ])
    expect(scenario.claims[0]).toMatchObject({
      measure: 'full',
      written: '0.115',
      source: 'capacity spreadsheet, cell F12',
    })
    expect(toText(scenario.claims[0].value)).toBe('23/200')
    expect(toText(scenario.claims[0].lastDigit)).toBe('1/1000')
    expect(scenario.simulation).toMatchObject({
      seed: 'night-shift-7',
      replications: 16,
      runLength: 20000,
      warmUp: 'auto',
      confidence: 0.95,
    })
    expect(scenario.simulation.tolerance).toEqual({ kind: 'relative', value: { numerator: 1n, denominator: 50n } })
    expect(scenario.expect).toBe('positive recurrent')
  })

  test.each([
    ['0.1', '1/10'],
    ['1/3', '1/3'],
    ['12.5 %', '1/8'],
    ['12.5%', '1/8'],
    ['1e-9', '1/1000000000'],
    ['"7"', '7'],
    ['0.30000000000000004', '7500000000000001/25000000000000000'],
  ])('a constant %s is %s exactly', (written, value) => {
    const scenario = parseScenario(variables('  t: { rate: a, then: {} }').replace('a: 2', `a: ${written}`), {
      file: 'f',
    })
    expect(toText(scenario.constants.get('a') as Fraction)).toBe(value)
  })

  test('--set overrides a number and a list, and refuses what is none', () => {
    const text = variables('  t: { rate: a, then: {} }')
    const set = (name: string, value: string) => parseScenario(text, { file: 'f', overrides: new Map([[name, value]]) })
    expect(toText(set('a', '30').constants.get('a') as Fraction)).toBe('30')
    expect((set('list', '[1, 2, 3]').constants.get('list') as Fraction[]).map(toText)).toEqual(['1', '2', '3'])
    expect(() => set('aa', '1')).toThrow('There is no constant "aa" to set. Did you mean "a"?')
    expect(() => set('a', 'x')).toThrow('is not a number')
    expect(() => set('list', '3')).toThrow('is a list in the file')
  })

  test.each(['class', 'return', 'constructor', 'on', 'yes', 'toString', 'hasOwnProperty', 'valueOf', 'prototype'])(
    'the word %s is a name like any other',
    (name) => {
      const text = `stillmark: 1
title: t
time: continuous
state: { ${name}: { from: 0, to: 1 } }
transitions: { go: { when: ${name} == 0, rate: 1, then: { ${name}: 1 } }, back: { when: ${name} == 1, rate: 1, then: { ${name}: 0 } } }
measures: { ${name}: { average: ${name} } }
`
      const scenario = parseScenario(text, { file: 'f' })
      expect(scenario.measures[0].name).toBe(name)
      expect((scenario.body as VariablesBody).variables[0].name).toBe(name)
    },
  )

  test('JSON is read as well', () => {
    const json = {
      stillmark: 1,
      title: 't',
      time: 'continuous',
      states: ['a', 'b'],
      rates: { a: { b: 1 }, b: { a: 0.5 } },
    }
    const body = parseScenario(JSON.stringify(json), { file: 'f.json' }).body as TableBody
    expect(body.entries.map(({ from, to, value }) => [from, to, toText(value)])).toEqual([
      [0, 1, '1'],
      [1, 0, '1/2'],
    ])
  })

  test('arrays, each and their indices', () => {
    const scenario = parseScenario(readFileSync('scenarios/three-station-line.yaml', 'utf8'), { file: 'f' })
    const body = scenario.body as VariablesBody
    expect(body.variables[0]).toMatchObject({ name: 'waiting', index: { from: 1, to: 3 }, start: [0, 0, 0] })
    expect(body.transitions[2]).toMatchObject({ name: 'pass', each: [{ name: 'i' }] })
  })
})

describe('faults, each at its line and column', () => {
  const t = '  t: { rate: 1, then: { n: n } }'
  test.each<[string, string, string[]]>([
    ['an unknown name', variables('  t: { rate: aa, then: {} }'), ['7:14 unknown-name']],
    ['no rate', variables('  t: { then: {} }'), ['7:3 key-missing']],
    ['no then', variables('  t: { rate: 1 }'), ['7:6 key-missing']],
    ['a probability in continuous time', variables('  t: { probability: 1, then: {} }'), ['7:8 wrong-clock']],
    ['a rate in discrete time', variables('  t: { rate: 1, then: {} }', 'discrete'), ['7:8 wrong-clock']],
    ['an unknown key', variables('  t: { rate: 1, wen: n > 0, then: {} }'), ['7:17 unknown-key']],
    ['a delay', variables('  t: { delay: { fixed: 1 }, then: {} }'), ['7:8 not-in-this-version']],
    [
      'copies and interrupted',
      variables('  t: { rate: 1, copies: 2, interrupted: resume, then: {} }'),
      ['7:17 not-in-this-version', '7:28 not-in-this-version'],
    ],
    ['a constant written to', variables('  t: { rate: 1, then: { a: 1 } }'), ['7:25 not-a-variable']],
    ['an element written twice', variables('  t: { rate: 1, then: { n: 1, "n ": 2 } }'), ['7:31 written-twice']],
    [
      'an each that hides a constant',
      variables('  t: { each: { a: { from: 1, to: 2 } }, rate: 1, then: {} }'),
      ['7:16 name-hidden'],
    ],
    [
      'a giant each',
      variables('  t: { each: { d: { from: 0, to: 10000000 } }, rate: 1, then: {} }'),
      ['7:19 too-many-copies'],
    ],
    ['a name of the language', variables(`${t}\nquantities: { min: 3 }`), ['8:15 bad-name']],
    ['a name twice', variables(`${t}\nquantities: { n: 3 }`), ['5:10 name-twice']],
    ['a circle', variables(`${t}\nquantities: { p: q + 1, q: p }`), ['8:18 circle', '8:28 circle']],
    ['remainder in continuous time', variables(`${t}\nremainder: stay`), ['8:1 no-remainder']],
    ['a measure of nothing', variables(`${t}\nmeasures: { m: {} }`), ['8:13 measure-kind']],
    ['a measure of two things', variables(`${t}\nmeasures: { m: { average: n, share: n } }`), ['8:13 measure-kind']],
    ['a quantile without level', variables(`${t}\nmeasures: { m: { quantile: n } }`), ['8:13 key-missing']],
    ['a level of 95', variables(`${t}\nmeasures: { m: { quantile: n, level: 95 } }`), ['8:38 bad-level']],
    ['a frequency of the state', variables(`${t}\nmeasures: { m: { frequency: n } }`), ['8:29 no-transition']],
    ['a product of frequencies', variables(`${t}\nmeasures: { m: { frequency: t * t } }`), ['8:31 not-linear']],
    ['a ratio of three', variables(`${t}\nmeasures: { m: { ratio: [t, t, t] } }`), ['8:25 ratio-sides']],
    ['a passage', variables(`${t}\nmeasures: { m: { passage: { until: n > 1 } } }`), ['8:18 not-in-this-version']],
    [
      'a claim about nothing',
      variables(`${t}\nmeasures: { m: { average: n } }\nclaims: { mm: { value: 1 } }`),
      ['9:11 unknown-measure'],
    ],
    [
      'a claim that is no number',
      variables(`${t}\nmeasures: { m: { average: n } }\nclaims: { m: { value: much } }`),
      ['9:23 not-a-number'],
    ],
    [
      'a comma in braces',
      variables(`${t}\nmeasures: { m: { average: n } }\nclaims: { m: { value: 1, source: sheet one, cell 3 } }`),
      ['9:45 comma-in-braces'],
    ],
    ['a confidence of 95', variables(`${t}\nsimulation: { confidence: 95 }`), ['8:27 bad-setting']],
    ['half a replication', variables(`${t}\nsimulation: { replications: 1.5 }`), ['8:29 bad-setting']],
    ['an unknown expectation', variables(`${t}\nexpect: stable`), ['8:9 not-allowed']],
    ['start outside', variables(t).replace('to: 5', 'to: 5, start: 6'), ['5:38 start-outside']],
    ['crossed bounds', variables(t).replace('to: 5', 'to: -5'), ['5:28 bounds-crossed']],
    ['half a bound', variables(t).replace('to: 5', 'to: 5 / 2'), ['5:28 not-whole']],
    ['an unknown format', variables(t).replace('stillmark: 1', 'stillmark: 2'), ['1:12 unknown-format']],
    ['a missing title', variables(t).replace('title: t\n', ''), ['1:1 key-missing']],
    ['a key twice', variables(`${t}\n${t}`), ['8:3 key-twice']],
    ['an alias', variables(t).replace('a: 2', 'a: &x 2, b: *x'), ['4:20 no-aliases', '4:26 no-aliases']],
    ['no YAML', 'stillmark: 1\n  title: [', ['1:12 not-yaml']],
    ['brackets in braces', variables('  t: { rate: list[1], then: {} }'), ['7:18 not-yaml']],
    ['no scenario', '- 1\n- 2', ['1:1 not-a-scenario']],
    ['nothing', '', ['1:1 not-a-scenario']],
    [
      'a row over 1',
      table('probabilities: { keen: { keen: 0.5, worn: 0.6 }, worn: { worn: 1 }, failed: { failed: 1 } }'),
      ['5:32 probabilities-off'],
    ],
    ['a missing row', table('probabilities: { keen: { keen: 1 }, worn: { worn: 1 } }'), ['1:1 probabilities-off']],
    [
      'fractions that miss 1',
      table(
        'probabilities: { keen: { keen: 1/3, worn: 1/3, failed: 333333333/1000000000 }, worn: { worn: 1 }, failed: { failed: 1 } }',
      ),
      ['5:32 probabilities-off'],
    ],
    [
      'a negative probability',
      table('probabilities: { keen: { keen: 1.5, worn: -0.5 }, worn: { worn: 1 }, failed: { failed: 1 } }'),
      ['5:32 probability-over-1', '5:43 negative-rate'],
    ],
    [
      'an unknown state',
      table('probabilities: { kene: { keen: 1 } }'),
      ['1:1 probabilities-off', '5:18 unknown-state'],
    ],
    [
      'a generator with a wrong diagonal',
      table('rates: { keen: { keen: -2, worn: 1 } }', 'continuous'),
      ['5:24 diagonal-off'],
    ],
    [
      'states of a table in a measure',
      `${table('rates: { keen: { worn: 1 }, worn: { keen: 1 } }', 'continuous')}measures: { m: { share: [kean] } }\n`,
      ['6:26 unknown-state'],
    ],
    [
      'two bodies',
      `${table('rates: { keen: { worn: 1 }, worn: { keen: 1 } }', 'continuous')}state: { n: { from: 0 } }\n`,
      ['6:1 two-bodies'],
    ],
  ])('%s', (_, text, faults) => expect(faultsOf(text)).toEqual(faults))

  test('all faults of a file are told at once', () => {
    const text = lockers
      .replace('doors - occupied', 'doors - occuped')
      .replace('level: 0.95', 'level: 95')
      .replace('confidence: 0.95', 'confidence: 95')
      .replace('warm-up: auto', 'warmup: auto')
    expect(faultsOf(text)).toEqual(['11:17 unknown-name', '23:46 bad-level', '30:3 unknown-key', '31:15 bad-setting'])
  })

  test('the message tells what is meant, with the place in front', () => {
    const text = lockers.replace('doors - occupied', 'doors - occuped')
    expect(() => parseScenario(text, { file: 'lockers.yaml' })).toThrow(
      'lockers.yaml:11:17 (quantities.free)  "occuped" is not a constant, quantity or state variable. Did you mean "occupied"?',
    )
  })
})

describe('tables and matrices', () => {
  const banner = '%%MatrixMarket matrix coordinate real general\n'
  const matrix = (content: string, extra = '') => {
    const body = parseScenario(`stillmark: 1\ntitle: t\ntime: discrete\nmatrix: m.mtx\n${extra}`, {
      file: 'f',
      readBeside: () => content,
    }).body as TableBody
    return { states: body.states, entries: body.entries.map(({ from, to, value }) => `${from}→${to} ${toText(value)}`) }
  }
  test('coordinates, with names made up', () =>
    expect(matrix(`${banner}% a comment\n2 2 3\n1 2 1\n2 1 0.25\n2 2 .75\n`)).toEqual({
      states: ['s1', 's2'],
      entries: ['0→1 1', '1→0 1/4', '1→1 3/4'],
    }))
  test('an array goes column by column', () =>
    expect(matrix('%%MatrixMarket matrix array real general\n2 2\n0.5\n0.25\n0.5\n0.75\n').entries).toEqual([
      '0→0 1/2',
      '1→0 1/4',
      '0→1 1/2',
      '1→1 3/4',
    ]))
  test('a symmetric one is completed', () =>
    expect(
      matrix('%%MatrixMarket matrix coordinate real symmetric\n2 2 2\n1 1 0.5\n2 1 0.5\n', 'remainder: stay\n').entries,
    ).toEqual(['0→0 1/2', '1→0 1/2', '0→1 1/2', '1→1 1/2']))
  test.each([
    ['no banner', '1 1 1\n'],
    ['a complex matrix', '%%MatrixMarket matrix coordinate complex general\n1 1 1\n1 1 1 0\n'],
    ['not square', `${banner}1 2 1\n1 1 1\n`],
    ['cut off', `${banner}2 2 3\n1 2 1\n`],
    ['a place outside', `${banner}2 2 1\n3 1 1\n`],
    ['no number', `${banner}1 1 1\n1 1 one\n`],
  ])('%s is told at the matrix', (_, content) =>
    expect(faultsOf('stillmark: 1\ntitle: t\ntime: discrete\nmatrix: m.mtx\n', () => content)).toEqual([
      '4:9 bad-matrix',
    ]),
  )
  test('CSV without header', () => {
    const body = parseScenario('stillmark: 1\ntitle: t\ntime: continuous\nmatrix: q.csv\nstates: [up, down]\n', {
      file: 'f',
      readBeside: () => '-0.5,0.5\r\n2,-2\r\n',
    }).body as TableBody
    expect(body.entries.map(({ from, to, value }) => `${from}→${to} ${toText(value)}`)).toEqual(['0→1 1/2', '1→0 2'])
  })
  test('a missing file is told', () =>
    expect(faultsOf('stillmark: 1\ntitle: t\ntime: discrete\nmatrix: m.mtx\n')).toEqual(['4:9 no-matrix']))
})

/** A model whose upper bound is the expression. */
const boundedBy = (bound: string) =>
  `stillmark: 1\ntitle: t\ntime: continuous\nstate: { n: { from: 0, to: "${bound}" } }\ntransitions: { t: { rate: 1, then: {} } }\n`

describe('a stranger’s file', () => {
  const scenarios = ['parcel-lockers', 'reorder-stock', 'wear-and-inspection', 'three-station-line', 'shift-rota'].map(
    (name) => readFileSync(`scenarios/${name}.yaml`, 'utf8'),
  )
  const holds = (text: string): void => {
    const begin = performance.now()
    try {
      parseScenario(text, { file: 'f.yaml' })
    } catch (error) {
      if (!(error instanceof StillmarkError)) throw error
      expect(error.faults.length).toBeGreaterThan(0)
    }
    expect(performance.now() - begin).toBeLessThan(2000)
  }
  const pieces = fc.constantFrom(
    '{',
    '}',
    '[',
    ']',
    ':',
    ',',
    '"',
    "'",
    '&a ',
    '*a',
    '!!',
    '- ',
    '\n',
    '  ',
    '%',
    '^',
    '0',
    '1e999',
    '-',
    '__proto__',
    'constructor',
    '#',
    '|',
    '>',
    '?',
    'null',
    '~',
    '<<',
    '\t',
    '\u0000',
    'é',
    '/',
    '.',
    'e9',
    'when',
    'not ',
  )

  test('mutated by pieces put in, cut out and doubled: nothing but messages of our own', () =>
    fc.assert(
      fc.property(
        fc.constantFrom(...scenarios),
        fc.array(fc.tuple(fc.nat(4000), fc.nat(30), pieces), { minLength: 1, maxLength: 6 }),
        (text, edits) => {
          let mutated = text
          for (const [at, cut, piece] of edits) {
            const place = at % (mutated.length + 1)
            mutated = mutated.slice(0, place) + piece + mutated.slice(place + (cut > 15 ? cut - 15 : 0))
          }
          holds(mutated)
        },
      ),
      { seed: 7, numRuns: 3000 },
    ))

  test('random text that looks like YAML', () =>
    fc.assert(
      fc.property(
        fc.array(
          fc.oneof(
            pieces,
            fc.constantFrom(
              'state',
              'transitions: ',
              'rate: ',
              'then: ',
              'a',
              'stillmark: 1\n',
              'title: t\n',
              'time: discrete\n',
            ),
          ),
          { maxLength: 60 },
        ),
        (parts) => holds(parts.join('')),
      ),
      { seed: 11, numRuns: 3000 },
    ))

  test.each([
    ['a hundred thousand brackets', '['.repeat(100_000)],
    ['a deep block', Array.from({ length: 5000 }, (_, i) => `${' '.repeat(i)}a:`).join('\n')],
    ['dashes upon dashes', '- '.repeat(50_000)],
    [
      'an alias bomb',
      `a: &a [x,x,x,x,x,x,x,x,x]\n${'bcdefghi'
        .split('')
        .map((name, i) => `${name}: &${name} [${Array(9).fill(`*${'abcdefgh'[i]}`).join(',')}]`)
        .join('\n')}`,
    ],
    ['a long key', `${'k'.repeat(1_000_000)}: 1`],
    [
      'prototype keys everywhere',
      'stillmark: 1\ntitle: t\ntime: continuous\nconstants: { __proto__: 1 }\nstate: { __proto__: { from: 0 } }\n__proto__: { a: 1 }\ntransitions: { t: { __proto__: 1, rate: 1, then: { __proto__: 1 } } }\n',
    ],
    ['blocks of lists', Array.from({ length: 5000 }, (_, i) => `${' '.repeat(i)}-`).join('\n')],
    ['folds within folds', boundedBy('sum(i, 1, 100000, sum(j, 1, 100000, 1))')],
    ['fractions that grow term by term', boundedBy('floor(sum(i, 1, 100000, 1 / i))')],
    ['long powers added up', boundedBy('sum(i, 1, 100000, (1 / i)^1000)')],
    ['tails added up', boundedBy('sum(i, 1, 100000, binomial_tail(1, 400, 1/7))')],
    ['ten thousand unknown keys', Array.from({ length: 10_000 }, (_, i) => `z${i}: 1`).join('\n')],
    [
      'two thousand quantities in a circle',
      `stillmark: 1\ntitle: t\ntime: continuous\nquantities:\n${Array.from({ length: 2000 }, (_, i) => `  q${i}: q${(i + 1) % 2000}`).join('\n')}\n`,
    ],
    ['numbers without end', `stillmark: 1\ntitle: t\ntime: continuous\nconstants: { a: ${'9'.repeat(100_000)} }\n`],
  ])('%s end in a message within 2 s', (_, text) => {
    holds(text)
    expect(faultsOf(text).length).toBeGreaterThan(0)
  })

  test.each([
    ['1e999', 'Write 12, 0.5, 1e-3, 1/3 or 2.5 %, with exponents from -400 to 400.'],
    ['0x10', 'Write 12, 0.5, 1e-3, 1/3 or 2.5 %, with exponents from -400 to 400.'],
    ['2 * x', 'A constant is a number; a formula belongs under "quantities".'],
  ])('%s is no constant, and what to write is said', (written, next) => {
    const text = variables('  t: { rate: a, then: {} }').replace('a: 2', `a: ${written}`)
    expect(() => parseScenario(text, { file: 'f' })).toThrow(`"${written}" is not a number. ${next}`)
  })

  test('a model that is only too large ends with a limit, a wrong one as wrong input', () => {
    const giant = '  t: { each: { d: { from: 0, to: 10000000 } }, rate: 1, then: {} }'
    const kindOf = (text: string) => {
      try {
        parseScenario(text, { file: 'f' })
      } catch (error) {
        return (error as StillmarkError).kind
      }
    }
    expect(kindOf(variables(giant))).toBe('limit')
    expect(kindOf(variables(giant.replace('rate: 1', 'rate: x')))).toBe('input')
  })

  test('a second document is told as such', () =>
    expect(faultsOf(`${lockers}\n---\na: 1\n`)).toEqual([`${lockers.split('\n').length + 1}:1 not-yaml`]))

  test('a table of 400 by 400 in CSV is read in under 2 s, each fault at its column', () => {
    const rows: string[][] = Array.from({ length: 400 }, (_, i) =>
      Array.from({ length: 400 }, (_, j) => (i === j ? '-399' : '1')),
    )
    const csv = () => rows.map((row) => row.join(',')).join('\n')
    const text = 'stillmark: 1\ntitle: t\ntime: continuous\nmatrix: q.csv\n'
    const begin = performance.now()
    expect((parseScenario(text, { file: 'f', readBeside: csv }).body as TableBody).entries).toHaveLength(400 * 399)
    expect(performance.now() - begin).toBeLessThan(2000)
    rows[1][3] = 'x'
    expect(() => parseScenario(text, { file: 'f', readBeside: csv })).toThrow('q.csv:2:10: "x" is not a number.')
  })

  test('quantities that double a hundred times cost no time', () => {
    const doubling = Array.from({ length: 100 }, (_, i) => `  q${i + 1}: q${i} + q${i}`).join('\n')
    holds(
      `stillmark: 1\ntitle: t\ntime: continuous\nquantities:\n  q0: n\n${doubling}\nstate: { n: { from: 0, to: 1 } }\ntransitions: { t: { rate: q100, then: {} } }\n`,
    )
  })
})
