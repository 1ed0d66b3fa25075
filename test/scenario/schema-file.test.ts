import { readdirSync, readFileSync } from 'node:fs'
import { Ajv2020 } from 'ajv/dist/2020.js'
import { expect, test } from 'vitest'
import { parse } from 'yaml'
import { jsonSchema } from '../../src/scenario/format-schema.js'

const shipped = JSON.parse(readFileSync('src/scenario/scenario.schema.json', 'utf8'))
/** As an editor does: by a validator that shares no code with the program's own check. */
const valid = new Ajv2020({ strict: false }).compile(shipped)
const scenarios = readdirSync('scenarios').filter((name) => name.endsWith('.yaml'))

test('the shipped JSON Schema is the one that the program checks with (else: npm run schema)', () => {
  expect(shipped).toEqual(JSON.parse(JSON.stringify(jsonSchema())))
})

test.each(scenarios)('an editor finds nothing wrong with %s', (name) => {
  valid(parse(readFileSync(`scenarios/${name}`, 'utf8')))
  expect(valid.errors ?? []).toEqual([])
})

test.each([
  ['an unknown key', { warmup: 3 }],
  ['an unknown kind of time', { time: 'now and then' }],
  ['another format', { stillmark: 2 }],
  ['an unknown expectation', { expect: 'stable' }],
])('an editor underlines %s', (_, wrong) => {
  const right = parse(readFileSync('scenarios/parcel-lockers.yaml', 'utf8'))
  expect(valid({ ...right, ...wrong })).toBe(false)
})
