import { describe, expect, test } from 'vitest'
import { fraction, toText } from '../../src/numbers/fraction.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { simplestBetween } from '../../src/recurrence/simplest-fraction.js'
import { birthDeath, modelOf } from './model-of.js'

const remedies = (model: Parameters<typeof classifyCountable>[0]) =>
  classifyCountable(model).remedies.map(
    ({ constant, now, exact, threshold, steadyWhen }) =>
      `${constant} = ${now}: steady ${steadyWhen} ${exact === undefined ? threshold.toFixed(9) : toText(exact)}`,
  )

describe('what would make it steady', () => {
  test('a desk with too many arrivals: fewer, faster or more', () => {
    expect(
      remedies(birthDeath('arrivals', 'min(n, desks)/minutes', '{ arrivals: 3.9, minutes: 1, desks: 3 }')),
    ).toEqual(['arrivals = 3.9: steady below 3', 'minutes = 1: steady below 10/13', 'desks = 3: steady above 39/10'])
  })

  test('at exact balance the threshold is where the model stands', () => {
    expect(remedies(birthDeath('a', 'b', '{ a: 17.29, b: 17.29 }'))).toEqual([
      'a = 17.29: steady below 1729/100',
      'b = 17.29: steady above 1729/100',
    ])
  })

  test('a threshold that is no fraction is bracketed by proof on both sides, and not called exact', () => {
    expect(remedies(birthDeath('a^2', '2', '{ a: 2 }'))).toEqual(['a = 2: steady below 1.414213562'])
  })

  // Weights n^(-c): steady for c > 1, by the series.
  test('a pull that is too weak', () => {
    expect(remedies(birthDeath('1', '1 + c/n', '{ c: 0.4 }'))).toEqual(['c = 0.4: steady above 1'])
  })

  test('of two stations in line the slower one', () => {
    const model = modelOf(`
      constants: { a: 2.5, first: 4, second: 2 }
      state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 } }
      transitions:
        come: { rate: a, then: { x: x + 1 } }
        pass: { when: x > 0, rate: first, then: { x: x - 1, y: y + 1 } }
        go: { when: y > 0, rate: second, then: { y: y - 1 } }
    `)
    expect(remedies(model)).toEqual(['a = 2.5: steady below 2', 'second = 2: steady above 5/2'])
  })

  test('a counter has no remedy, a steady model needs none', () => {
    const counter = modelOf(`
      constants: { a: 1 }
      state: { n: { from: 0, start: 0 } }
      transitions: { up: { rate: a, then: { n: n + 1 } } }
    `)
    expect(remedies(counter)).toEqual([])
    expect(remedies(birthDeath('a', '2', '{ a: 1 }'))).toEqual([])
  })
})

test.each([
  [1, 3, 1, 2, '1/2'],
  [314, 100, 315, 100, '22/7'],
  [-5, 2, -9, 4, '-5/2'],
  [-1, 2, 1, 3, '0'],
  [7, 3, 7, 3, '7/3'],
])('the simplest fraction between %d/%d and %d/%d is %s', (a, b, c, d, expected) => {
  expect(toText(simplestBetween(fraction(a, b), fraction(c, d)))).toBe(expected)
})
