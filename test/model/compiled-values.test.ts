import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { StillmarkError } from '../../src/errors/stillmark-error.js'
import { compile, newMoves } from '../../src/model/compile.js'
import type { Functional, VariablesModel } from '../../src/model/model.js'
import {
  binomial,
  binomialTail,
  geometric,
  geometricTail,
  poisson,
  poissonTail,
} from '../../src/model/probability-functions.js'
import {
  add,
  divide,
  type Fraction,
  fraction,
  fractionOfDouble,
  fractionOfText,
  multiply,
  one,
  power,
  subtract,
  toNumber,
  zero,
} from '../../src/numbers/fraction.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'

function modelOf(lines: string, time = 'continuous'): VariablesModel {
  const model = compile(parseScenario(`stillmark: 1\ntitle: t\ntime: ${time}\n${lines}`, { file: 'f.yaml' }))
  if (model.kind !== 'variables') throw new Error('a table')
  return model
}

/** The moves of a state as text: label, copy, rate, next state. */
function movesOf(model: VariablesModel, state: readonly number[]): string[] {
  const moves = newMoves(model.width)
  model.expand(state, moves)
  return Array.from({ length: moves.count }, (_, k) => {
    const { transition, copy } = moves.label[k] < 0 ? { transition: 'stay', copy: [] } : model.labels[moves.label[k]]
    const next = Array.from(moves.next.subarray(k * model.width, (k + 1) * model.width))
    return `${transition}${copy.length === 0 ? '' : `[${copy.join(', ')}]`} ${moves.rate[k]} → ${next.join(' ')}`
  })
}

function faultOf(make: () => unknown): string {
  try {
    make()
  } catch (error) {
    if (error instanceof StillmarkError) return `${error.code}: ${error.message}`
    throw error
  }
  return 'none'
}

describe('moves', () => {
  const model = modelOf(`constants: { rate: 3, size: [1, 2] }
state: { n: { from: 0, to: 3, start: 1 }, at: { index: { from: 2, to: 3 }, from: 0, to: 9, start: [4, 5] } }
transitions:
  up: { when: n < 3, rate: rate * n, then: { n: n + 1 } }
  swap:
    rate: 1
    then:
      at[2]: at[3]
      at[3]: at[2]
  move: { each: { i: { from: 1, to: 2 }, j: { from: i, to: 2 } }, when: n > 0, rate: "size[i] * j", then: { n: n - 1 } }
  none: { each: { i: { from: 2, to: 1 } }, rate: 1, then: {} }
measures: { ups: { frequency: "2 * up - move[1, 2] / 4" }, all: { frequency: "sum(j, 1, 2, move[1, j])" } }
`)
  test('fire where they may, in the order of the file, with copies and simultaneous values', () => {
    expect(model.elements).toEqual(['n', 'at[2]', 'at[3]'])
    expect(movesOf(model, [1, 4, 5])).toEqual([
      'up 3 → 2 4 5',
      'swap 1 → 1 5 4',
      'move[1, 1] 1 → 0 4 5',
      'move[1, 2] 2 → 0 4 5',
      'move[2, 2] 4 → 0 4 5',
    ])
    expect(movesOf(model, [0, 4, 5])).toEqual(['swap 1 → 0 5 4'])
    expect(movesOf(model, [3, 1, 2])[0]).toBe('swap 1 → 3 2 1')
  })
  test('weights of a frequency are its coefficients', () => {
    const weights = (i: number) =>
      Array.from((model.measures[i] as { of: Extract<Functional, { kind: 'frequency' }> }).of.weights)
    expect(model.labels.map(({ transition, copy }) => `${transition} ${copy.join(' ')}`.trim())).toEqual([
      'up',
      'swap',
      'move 1 1',
      'move 1 2',
      'move 2 2',
    ])
    expect(weights(0)).toEqual([2, 0, 0, -0.25, 0])
    expect(weights(1)).toEqual([0, 0, 1, 1, 0])
  })
  test('the exact way lists the same', () => {
    for (const state of [
      [1, 4, 5],
      [0, 4, 5],
      [3, 1, 2],
    ]) {
      const exactly = model
        .expandExactly(state)
        .map(({ label, rate, next }) => `${label} ${rate && toNumber(rate)} → ${next.join(' ')}`)
      const moves = newMoves(model.width)
      model.expand(state, moves)
      const fast = Array.from(
        { length: moves.count },
        (_, k) => `${moves.label[k]} ${moves.rate[k]} → ${Array.from(moves.next.subarray(k * 3, k * 3 + 3)).join(' ')}`,
      )
      expect(exactly).toEqual(fast)
    }
  })
})

describe('guards are decided as written, not as rounded', () => {
  const counts = (guard: string) => {
    const model = modelOf(
      `state: { n: { from: 0, to: 1000 } }\ntransitions: { t: { when: "${guard}", rate: 1, then: {} } }\n`,
    )
    return Array.from({ length: 40 }, (_, n) => n).filter((n) => movesOf(model, [n]).length > 0)
  }
  test.each<[string, number[]]>([
    ['n * 0.1 == 0.3', [3]],
    ['n / 10 * 3 == 0.9', [3]],
    ['0.1 * n + 0.2 == 0.3', [1]],
    ['n / 3 * 3 == n and n < 8', [0, 1, 2, 3, 4, 5, 6, 7]],
    ['floor(n * 0.1 * 10) == n and n < 5', [0, 1, 2, 3, 4]],
    ['n * 0.7 % 0.7 == 0 and n < 4', [0, 1, 2, 3]],
    ['ceil(n / 49 * 49) == n and n < 4', [0, 1, 2, 3]],
    ['n * 0.1 - 0.3 and n < 5', [0, 1, 2, 4]],
  ])('%s', (guard, states) => expect(counts(guard)).toEqual(states))

  test('a rate that is 0 as written is no move', () => {
    const model = modelOf('state: { n: { from: 0, to: 9 } }\ntransitions: { t: { rate: n * 0.1 - 0.3, then: {} } }\n')
    expect(movesOf(model, [3])).toEqual([])
    expect(faultOf(() => movesOf(model, [2]))).toContain('negative-rate')
  })
})

describe('values', () => {
  // Expressions that grow at random over one variable and constants with awkward decimals.
  const leaf = fc.constantFrom('n', '0.1', '1/3', '7', 'a', '2.5', 'n + 1')
  const expression = fc.letrec<{ tree: string }>((tie) => ({
    tree: fc.oneof(
      { maxDepth: 4 },
      leaf,
      fc.tuple(tie('tree'), fc.constantFrom('+', '-', '*', '/'), tie('tree')).map(([a, op, b]) => `(${a} ${op} ${b})`),
      fc.tuple(fc.constantFrom('floor', 'ceil', 'abs'), tie('tree')).map(([name, a]) => `${name}(${a})`),
      fc.tuple(fc.constantFrom('min', 'max'), tie('tree'), tie('tree')).map(([name, a, b]) => `${name}(${a}, ${b})`),
      fc.tuple(tie('tree'), tie('tree'), tie('tree')).map(([c, a, b]) => `if(${c} > 1, ${a}, ${b})`),
      fc.tuple(tie('tree'), fc.constantFrom('0.7', '3', '1/3')).map(([a, b]) => `(${a} % ${b})`),
      tie('tree').map((a) => `(${a})^2`),
    ),
  })).tree

  test('the error bound holds the exact value, for random expressions', () =>
    fc.assert(
      fc.property(expression, fc.integer({ min: -20, max: 20 }), (text, n) => {
        const model = modelOf(
          `constants: { a: 0.3 }\nstate: { n: { from: -30, to: 30 } }\ntransitions: { t: { rate: 1, then: {} } }\nmeasures: { m: { average: "${text}" } }\n`,
        )
        const { of } = model.measures[0] as { of: Extract<Functional, { kind: 'average' }> }
        let exact: Fraction | undefined
        try {
          exact = of.value.exactOf([n])
        } catch {
          expect(() => of.value.valueOf([n])).toThrow() // no value in fractions: none in doubles
          return
        }
        if (exact === undefined) return
        const value = of.value.valueOf([n])
        const error = of.value.errorOf([n])
        fc.pre(Number.isFinite(error))
        const miss = subtract(fractionOfDouble(value), exact)
        const size = Math.abs(toNumber(miss))
        expect(size).toBeLessThanOrEqual(error)
        expect(error).toBeLessThan(1e-9 * Math.max(1, Math.abs(value)) + 1e-6 * Math.abs(value))
      }),
      { seed: 7, numRuns: 1500 },
    ))
})

describe('faults of a state name it, the transition and the place', () => {
  test.each<[string, string, string, string]>([
    [
      'negative-rate',
      'state: { n: { from: 0, to: 5, start: 2 } }\ntransitions: { t: { rate: 1 - n, then: {} } }\n',
      'continuous',
      'f.yaml:5:16 (transitions.t)  In the state n 2, transition "t": the rate is -1',
    ],
    [
      'no-value',
      'state: { n: { from: 0, to: 5 } }\ntransitions: { t: { rate: 1 / n, then: {} } }\n',
      'continuous',
      'In the state n 0, transition "t": A division by 0.',
    ],
    [
      'outside-bounds',
      'state: { n: { from: 0, to: 5, start: 5 } }\ntransitions: { t: { rate: 1, then: { n: n + 1 } } }\n',
      'continuous',
      '"n" becomes 6, outside its bounds 0 to 5.',
    ],
    [
      'probability-over-1',
      'state: { n: { from: 0, to: 5, start: 5 } }\ntransitions: { t: { probability: n, then: {} } }\n',
      'discrete',
      'the probability is 5, over 1.',
    ],
    [
      'probabilities-off',
      'state: { n: { from: 0, to: 5 } }\ntransitions: { t: { probability: 0.4, then: {} } }\n',
      'discrete',
      'In the state n 0 the probabilities sum to 0.4, not to 1.',
    ],
    [
      'index-outside',
      'state: { n: { from: 0, to: 5, start: 4 }, at: { index: { from: 1, to: 3 }, from: 0, to: 1 } }\ntransitions: { t: { rate: "at[n] + 1", then: {} } }\n',
      'continuous',
      '"at[4]" is not there.',
    ],
    [
      'written-twice',
      'state: { n: { from: 1, to: 3 }, at: { index: { from: 1, to: 3 }, from: 0, to: 1 } }\ntransitions:\n  t:\n    rate: 1\n    then:\n      at[n]: 1\n      at[1]: 1\n',
      'continuous',
      '"at[1]" is written twice.',
    ],
    [
      'not-whole',
      'state: { n: { from: 0, to: 5, start: 1 } }\ntransitions: { t: { rate: 1, then: { n: n / 2 } } }\n',
      'continuous',
      '0.5 is no whole number',
    ],
    [
      'negative-rate',
      'state: { n: { from: 0, to: 5 } }\ntransitions: { t: { each: { d: { from: 1, to: 3 } }, rate: 2 - d, then: {} } }\n',
      'continuous',
      'transition "t[3]": the rate is -1',
    ],
  ])('%s', (code, lines, time, said) => {
    const model = modelOf(lines, time)
    const fault = faultOf(() => movesOf(model, Array.from(model.start)))
    expect(fault).toContain(`${code}: `)
    expect(fault).toContain(said)
  })
})

describe('discrete time', () => {
  test('what remainder: stay leaves comes last, and nothing where nothing is left', () => {
    const model = modelOf(
      'remainder: stay\nstate: { n: { from: 0, to: 3 } }\ntransitions: { up: { when: n < 3, probability: 1/3 * n, then: { n: n + 1 } } }\n',
      'discrete',
    )
    expect(movesOf(model, [0])).toEqual(['stay 1 → 0'])
    expect(movesOf(model, [1])).toEqual([`up ${1 / 3} → 2`, `stay ${1 - 1 / 3} → 1`])
    expect(movesOf(model, [3])).toEqual(['stay 1 → 3'])
  })
  test('a sum within 1e-9 of 1 is brought to 1; one beyond is refused', () => {
    const of = (p: string) =>
      modelOf(
        `state: { n: { from: 0, to: 1 } }\ntransitions: { a: { probability: ${p}, then: {} }, b: { probability: 0.5, then: { n: 1 - n } } }\n`,
        'discrete',
      )
    const moves = newMoves(1)
    of('0.5000000005').expand([0], moves)
    expect(moves.rate[0] + moves.rate[1]).toBe(1)
    expect(moves.rate[1]).toBeCloseTo(0.5 / 1.0000000005, 15)
    expect(faultOf(() => of('0.500000002').expand([0], moves))).toContain('probabilities-off')
  })
  test('thirds sum to 1 and are left alone', () => {
    const model = modelOf(
      'state: { n: { from: 0, to: 2 } }\ntransitions: { t: { each: { d: { from: 0, to: 2 } }, probability: 1/3, then: { n: d } } }\n',
      'discrete',
    )
    expect(movesOf(model, [0])).toEqual([`t[0] ${1 / 3} → 0`, `t[1] ${1 / 3} → 1`, `t[2] ${1 / 3} → 2`])
  })
})

describe('probability functions', () => {
  const within = ({ value, error }: { value: number; error: number }, exact: number) => {
    expect(Math.abs(value - exact)).toBeLessThanOrEqual(error + Number.EPSILON * exact)
    expect(error).toBeLessThanOrEqual(1e-12 * exact + 1e-300)
  }
  /** e^-m by its series in fractions, to far beyond a double. */
  const expMinus = (m: Fraction): Fraction => {
    let sum = one
    let term = one
    for (let k = 1; k < 120; k++) {
      term = divide(multiply(term, m), fraction(k))
      sum = add(sum, term)
    }
    return divide(one, sum)
  }
  test.each([
    ['0.5', 0],
    ['0.5', 3],
    ['4.2', 4],
    ['4.2', 20],
    ['20', 60],
    ['12.25', 12],
  ])('poisson with mean %s at %i, and its tail', (mean, k) => {
    const m = fractionOfText(mean) as Fraction
    const error = 0
    let term = expMinus(m)
    let below = zero
    for (let i = 1; i <= k; i++) {
      below = add(below, term)
      term = divide(multiply(term, m), fraction(i))
    }
    within(poisson(k, toNumber(m), error), toNumber(term))
    within(poissonTail(k, toNumber(m), error), toNumber(subtract(one, below)))
  })
  test.each([
    [0, 5, '1/4'],
    [3, 5, '1/4'],
    [5, 5, '1/4'],
    [40, 100, '1/2'],
    [99, 100, '1/8'],
    [7, 300, '1/64'],
  ])('binomial at %i of %i with %s, and its tail', (k, n, p) => {
    const share = fractionOfText(p) as Fraction
    const rest = subtract(one, share)
    const term = (i: number): Fraction => {
      let ways = 1n
      for (let j = 1; j <= i; j++) ways = (ways * BigInt(n - j + 1)) / BigInt(j)
      return multiply(fraction(ways), multiply(i === 0 ? one : power(share, i), i === n ? one : power(rest, n - i)))
    }
    let tail = zero
    for (let i = k; i <= n; i++) tail = add(tail, term(i))
    within(binomial(k, n, toNumber(share), 0), toNumber(term(k)))
    within(binomialTail(k, n, toNumber(share), 0), toNumber(tail))
  })
  test('geometric counts failures before the first success, from 0', () => {
    within(geometric(0, 0.25, 0), 0.25)
    within(geometric(3, 0.25, 0), 0.25 * 0.75 ** 3)
    within(geometricTail(3, 0.25, 0), 0.75 ** 3)
    expect(geometricTail(0, 0.25, 0)).toEqual({ value: 1, error: 0 })
  })
  test('outside their domain they refuse', () => {
    expect(() => poisson(1, -1, 0)).toThrow('mean')
    expect(() => binomial(1, 3, 1.5, 0)).toThrow('probability from 0 to 1')
    expect(() => geometric(1, 0, 0)).toThrow('above 0')
  })
})
