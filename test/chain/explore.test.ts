import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { explore } from '../../src/chain/explore.js'
import { newPackedStates } from '../../src/chain/packed-states.js'
import { shownState } from '../../src/chain/shown-state.js'
import { compile } from '../../src/model/compile.js'
import type { VariablesModel } from '../../src/model/model.js'
import { toNumber } from '../../src/numbers/fraction.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'

const modelOf = (lines: string, time = 'continuous') =>
  compile(parseScenario(`stillmark: 1\ntitle: t\ntime: ${time}\n${lines}`, { file: 'f.yaml' }))

describe('explore', () => {
  test('states come breadth first from the start, arcs in the order of the labels', () => {
    const chain = explore(
      modelOf(`state: { n: { from: 0, to: 3, start: 1 } }
transitions:
  up: { when: n < 3, rate: 2, then: { n: n + 1 } }
  stay: { rate: 5, then: {} }
  down: { when: n > 0, rate: 3, then: { n: n - 1 } }
`),
    )
    expect(Array.from(chain.values)).toEqual([1, 2, 0, 3])
    expect(Array.from(chain.rowStart)).toEqual([0, 3, 6, 8, 10])
    expect(Array.from(chain.target)).toEqual([1, 0, 2, 3, 1, 0, 0, 2, 3, 1])
    expect(Array.from(chain.label)).toEqual([0, 1, 2, 0, 1, 2, 0, 1, 1, 2])
    expect(chain.values.buffer).toBeInstanceOf(SharedArrayBuffer)
  })

  test('a table has all its states, reachable or not, under their names', () => {
    const chain = explore(modelOf('states: [a, b, lone]\nstart: b\nrates: { a: { b: 1/3 }, b: { a: 2 } }\n'))
    expect([chain.size, chain.start, Array.from(chain.rowStart), Array.from(chain.rate)]).toEqual([
      3,
      1,
      [0, 1, 2, 2],
      [1 / 3, 2],
    ])
    expect(chain.rateError[0]).toBeGreaterThan(0)
    expect(chain.rateError[1]).toBe(0)
    expect(shownState(chain, 2)).toBe('lone')
  })

  test('a state is shown by its variables, arrays as lists', () => {
    const chain = explore(
      modelOf(
        'state: { n: { from: 0, to: 0 }, w: { index: { from: 2, to: 3 }, from: 0, to: 4, start: [3, 4] } }\ntransitions: { t: { rate: 1, then: {} } }\n',
      ),
    )
    expect(shownState(chain, 0)).toEqual({ n: 0, w: [3, 4] })
  })

  test.each([
    ['without bound', 'n: { from: 0 }, m: { from: 0, to: 3 }', '"n" has reached the range 0 to'],
    ['the widest', 'n: { from: 0, to: 100000 }, m: { from: 0, to: 3 }', '"n" has reached the range 0 to'],
  ])('the cap names the variable that grew: %s', (_, state, said) => {
    const model = modelOf(
      `state: { ${state} }\ntransitions:\n  a: { when: n < 100000, rate: 1, then: { n: n + 1 } }\n  b: { when: m < 3, rate: 1, then: { m: m + 1 } }\n`,
    )
    expect(() => explore(model, { maxStates: 500 })).toThrow(said)
    expect(() => explore(model, { maxStates: 500 })).toThrow('more than 500 states')
  })

  test('a memory budget ends it as well', () => {
    const model = modelOf(
      'state: { n: { from: 0, to: 1000000 } }\ntransitions: { a: { when: n < 1000000, rate: 1, then: { n: n + 1 } } }\n',
    )
    expect(() => explore(model, { maxMemoryBytes: 2e6 })).toThrow('memory')
  })

  test('guards bound what has no bound', () => {
    const chain = explore(
      modelOf(
        'state: { n: { start: 0 } }\ntransitions: { a: { when: n < 7, rate: 1, then: { n: n + 1 } }, b: { when: n > -7, rate: 1, then: { n: n - 1 } } }\n',
      ),
    )
    expect(chain.size).toBe(15)
  })

  // A second enumeration that shares nothing with the first: states as text in a map, moves by the exact interpreter.
  test('random models: the same states and rates as a naive enumeration', () =>
    fc.assert(
      fc.property(
        fc.array(
          fc.record({
            jump: fc.tuple(fc.integer({ min: -2, max: 2 }), fc.integer({ min: -2, max: 2 })),
            rate: fc.integer({ min: 1, max: 9 }),
            low: fc.integer({ min: 0, max: 4 }),
          }),
          { minLength: 1, maxLength: 4 },
        ),
        (rules) => {
          const lines = rules.map(
            ({ jump: [dx, dy], rate, low }, i) =>
              `  t${i}: { when: x + ${dx} >= 0 and x + ${dx} <= 5 and y + ${dy} >= 0 and y + ${dy} <= 4 and x >= ${low} - 2, rate: ${rate} + x / 3, then: { x: x + ${dx}, y: y + ${dy} } }`,
          )
          const model = modelOf(
            `state: { x: { from: 0, to: 5, start: 2 }, y: { from: 0, to: 4, start: 2 } }\ntransitions:\n${lines.join('\n')}\n`,
          ) as VariablesModel
          const chain = explore(model)
          const found = new Map<string, number>([['2 2', 0]])
          const queue = [[2, 2]]
          const arcs: string[] = []
          for (let i = 0; i < queue.length; i++) {
            for (const { label, rate, next } of model.expandExactly(queue[i])) {
              const key = next.join(' ')
              if (!found.has(key)) {
                found.set(key, queue.length)
                queue.push([...next])
              }
              arcs.push(`${i} ${label} ${rate && toNumber(rate)} ${found.get(key)}`)
            }
          }
          expect(chain.size).toBe(queue.length)
          expect(Array.from(chain.values)).toEqual(queue.flat())
          const own: string[] = []
          for (let i = 0; i < chain.size; i++) {
            for (let arc = chain.rowStart[i]; arc < chain.rowStart[i + 1]; arc++) {
              own.push(`${i} ${chain.label[arc]} ${chain.rate[arc]} ${chain.target[arc]}`)
            }
          }
          // Rates may differ by the rounding that their bound allows; here they are compared to 15 digits.
          const rounded = (arc: string) => arc.replace(/ (\d+\.\d+) /, (_, rate) => ` ${Number(rate).toPrecision(14)} `)
          expect(own.map(rounded)).toEqual(arcs.map(rounded))
        },
      ),
      { seed: 7, numRuns: 150 },
    ))
})

describe('packed states', () => {
  test('a hundred thousand vectors are told apart and found again', () => {
    const states = newPackedStates(3)
    const vector = new Float64Array(3)
    const indexOf = (i: number) => {
      vector.set([i % 47, Math.floor(i / 47) - 1000, (i * 7919) % 101])
      return states.indexOf(vector, 0)
    }
    for (let i = 0; i < 100_000; i++) expect(indexOf(i)).toBe(i)
    for (let i = 0; i < 100_000; i += 997) expect(indexOf(i)).toBe(i)
    expect(states.count).toBe(100_000)
  })
  test('a number that does not fit 32 bits is refused', () => {
    const states = newPackedStates(1)
    expect(states.indexOf(Float64Array.of(2 ** 31), 0)).toBe(-1)
    expect(states.indexOf(Float64Array.of(-(2 ** 31)), 0)).toBe(0)
  })
})
