import { readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { type Check, finiteCases, relativeError } from './finite-cases.js'

// Peak relative error of each case when it was last measured; `npx tsx test/published/remake-accuracy.ts` remakes it.
const recorded: Record<string, number> = JSON.parse(
  readFileSync(new URL('accuracy.json', import.meta.url), 'utf8'),
).finite

/** Printed values have 25 digits: what is finer than half a unit of the last can't be told. */
const printedTo = 1e-24

describe.each(finiteCases)('$id ($source)', ({ id, checks }) => {
  const made: Check[] = checks()
  test.each(made)('$what is $expected', (check) => {
    expect(relativeError(check)).toBeLessThanOrEqual(check.within ?? 1e-12)
  })
  test('is as accurate as it was: at most four times the recorded peak error', () => {
    const peak = Math.max(...made.map(relativeError))
    expect(peak).toBeLessThanOrEqual(4 * Math.max(recorded[id], Number.EPSILON / 4))
  })
  test('every error bound is true', () => {
    for (const check of made) {
      if (check.errorBound === undefined || check.within !== undefined) continue
      const size = Math.abs(Number(check.expected))
      expect(relativeError(check) * size).toBeLessThanOrEqual(check.errorBound + printedTo * size)
    }
  })
})

test('all finite cases of the references are here', () => {
  expect(finiteCases.length).toBe(59)
})
