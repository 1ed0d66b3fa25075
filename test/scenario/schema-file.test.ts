import { readFileSync } from 'node:fs'
import { expect, test } from 'vitest'
import { jsonSchema } from '../../src/scenario/format-schema.js'

test('the shipped JSON Schema is the one that the program checks with (else: npm run schema)', () => {
  const shipped = JSON.parse(readFileSync('src/scenario/scenario.schema.json', 'utf8'))
  expect(shipped).toEqual(JSON.parse(JSON.stringify(jsonSchema())))
})
