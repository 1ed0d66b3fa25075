import { describe, expect, test } from 'vitest'
import { type Fraction, toText } from '../../src/numbers/fraction.js'
import { evaluateExactly, NoValue } from '../../src/scenario/evaluate-exactly.js'
import { readSyntax } from '../../src/scenario/expression-syntax.js'
import { type Allowed, resolveNames, type Scope } from '../../src/scenario/resolve-names.js'

const scope: Scope = {
  constants: new Map<string, Fraction | readonly Fraction[]>([
    ['rate', { numerator: 9n, denominator: 2n }],
    ['mean', [1n, 2n, 3n].map((n) => ({ numerator: n, denominator: 1n }))],
  ]),
  quantities: new Set(['free']),
  variables: new Map([
    ['occupied', {}],
    ['waiting', { index: { from: 1, to: 3 } }],
  ]),
  transitions: new Map([
    ['deposit', 0],
    ['move', 2],
  ]),
}
const everything: Allowed = { state: true, transitions: true, bound: new Set(['d']) }

function faultsIn(text: string, allowed = everything): string[] {
  const read = readSyntax(text)
  if ('fault' in read) return [`${read.fault.at} ${read.fault.what} ${read.fault.next}`]
  const faults: string[] = []
  resolveNames(
    read.syntax,
    scope,
    allowed,
    (offset) => ({ line: 1, column: offset + 1 }),
    (code, at, what, next) => faults.push(`${at.column} ${code}: ${what} ${next}`),
  )
  return faults
}

function exactText(text: string): string | undefined {
  const read = readSyntax(text)
  if ('fault' in read) throw new Error(read.fault.what)
  const expression = resolveNames(
    read.syntax,
    scope,
    everything,
    () => ({ line: 1, column: 1 }),
    (code) => {
      throw new Error(code)
    },
  )
  const value = evaluateExactly(expression, {
    constants: scope.constants,
    quantities: new Map(),
    variable: (name, index) => ({ numerator: name === 'occupied' ? 5n : BigInt(index ?? 0) * 10n, denominator: 1n }),
    bound: new Map([['d', { numerator: 2n, denominator: 1n }]]),
  })
  return value === undefined ? undefined : toText(value)
}

describe('values, exactly', () => {
  test.each([
    ['-2^2', '-4'],
    ['2^3^2', '512'],
    ['2^-1', '1/2'],
    ['(-2)^2', '4'],
    ['-7 % 3', '2'], // the sign binds tighter than the remainder, which has the divisor's sign
    ['-(7 % 3)', '-1'],
    ['7 % (-3)', '-2'],
    ['7.5 % 2', '3/2'],
    ['1 - 2 - 3', '-4'],
    ['8 / 2 / 2', '2'],
    ['1 + 2 * 3', '7'],
    ['0.1 + 0.2 == 0.3', '1'],
    ['1 < 2 and not 3 < 2', '1'],
    ['true or 1 / 0 > 1', '1'],
    ['false and 1 / 0 > 1', '0'],
    ['not 0', '1'],
    ['if(occupied > 4, 10, 20)', '10'],
    ['if(occupied > 5, 1 / 0, 20)', '20'],
    ['min(3, rate, 7)', '3'],
    ['max(3, rate)', '9/2'],
    ['floor(-rate)', '-5'],
    ['ceil(-rate)', '-4'],
    ['abs(-rate)', '9/2'],
    ['sqrt(9/4)', '3/2'],
    ['exp(0) + log(1)', '1'],
    ['mean[2] + waiting[3]', '32'],
    ['mean[d]', '2'],
    ['sum(i, 1, 3, waiting[i] * mean[i])', '140'],
    ['sum(i, 3, 1, waiting[i])', '0'],
    ['max_of(i, 1, 3, waiting[i])', '30'],
    ['min_of(i, 1, 3, 10 - waiting[i])', '-20'],
    ['binomial(2, 4, 1/2)', '3/8'],
    ['binomial_tail(3, 4, 1/2)', '5/16'],
    ['geometric(2, 1/3)', '4/27'],
    ['geometric_tail(2, 1/3)', '4/9'],
    ['poisson_tail(0, 3)', '1'],
    ['1e3', '1000'],
    ['.5', '1/2'],
    ['(occupied > 3) + 1', '2'],
  ])('%s is %s', (text, value) => expect(exactText(text)).toBe(value))

  test.each(['exp(1)', 'log(2)', 'sqrt(2)', '2^0.5', 'poisson(1, 2)', '9^9^9^9'])(
    '%s is not followed in fractions',
    (text) => expect(exactText(text)).toBeUndefined(),
  )
  test.each([
    '1 / 0',
    '1 % 0',
    '0^-1',
    'log(0)',
    'sqrt(-1)',
    'binomial(1, 2, 3/2)',
    'geometric(1, 0)',
    '(-2)^0.5',
    'max_of(i, 2, 1, i)',
  ])('%s has no value, and says so', (text) => expect(() => exactText(text)).toThrow(NoValue))
})

describe('what is refused, where, and what is said', () => {
  test.each([
    [
      'occuped + 1',
      '1 unknown-name: "occuped" is not a constant, quantity or state variable or a transition. Did you mean "occupied"?',
    ],
    ['1 < 2 < 3', '6 Comparisons do not chain. Write a < b and b < c.'],
    ['1 && 2', '2 "&&" has no meaning in an expression. Write "and".'],
    ['1 || 2', '2 "||" has no meaning in an expression. Write "or".'],
    ['!1', '0 "!" has no meaning in an expression. Write "not".'],
    ['2 ** 3', '3 "**" has no meaning in an expression. Write ^ for a power.'],
    ['rate = 3', '5 "=" has no meaning in an expression. Write == to compare.'],
    ['rate === 3', '7 "=" has no meaning in an expression. Write == to compare.'],
    ['', '0 An expression is missing. Write a number or a formula.'],
    ['(1 + 2', '6 The expression ends too early, after "2". A bracket is not closed.'],
    ['1 +', '3 The expression ends too early, after "+". Something is missing at its end.'],
    [
      '2 occupied',
      '2 "occupied" can\'t stand here, after "2". An operator or a comma is missing, or a bracket is wrong.',
    ],
    [
      'waiting',
      '1 index-missing: The variable "waiting" is an array. Write waiting[1] to waiting[3], or sum(i, 1, 3, waiting[i]).',
    ],
    ['waiting[4]', '1 index-outside: "waiting" has no element 4. Its elements are 1 to 3.'],
    ['mean[0]', '1 index-outside: "mean" has no element 0. Its elements are 1 to 3.'],
    ['occupied[1]', '1 no-index: The variable "occupied" has no index. Write occupied.'],
    ['mini(1, 2)', '1 unknown-function: "mini" is not a function. Did you mean "min"?'],
    ['floor(1, 2)', '1 argument-count: "floor" takes 1 argument, here are 2. Check its commas and brackets.'],
    ['if(1, 2)', '1 argument-count: "if" takes 3 arguments, here are 2. Write if(condition, a, b).'],
    [
      'sum(occupied, 1, 3, 1)',
      '5 name-hidden: "occupied" is a name already, and an index may not hide it. Choose another name for the index.',
    ],
    ['rate(3)', '1 not-a-function: "rate" is not a function. Write * to multiply, and [ ] for an index.'],
    [
      'move[1]',
      '1 index-count: The transition "move" has 2 indices, here is 1. Write move for all its copies together.',
    ],
    ['1e999', '0 "1e999" is beyond the numbers that can be kept. Exponents may go from -400 to 400.'],
    ['a ? 1 : 2', '2 "?" has no meaning in an expression. Write if(condition, a, b).'],
  ])('%j', (text, fault) => expect(faultsIn(text)[0]?.replace('here are 1.', 'here is 1.')).toBe(fault))

  test('every unknown name of an expression is told, once a place', () =>
    expect(faultsIn('aaaa + bbbb * aaaa').map((each) => each.slice(0, 20))).toEqual([
      '1 unknown-name: "aaa',
      '8 unknown-name: "bbb',
      '15 unknown-name: "aa',
    ]))

  test('a transition has no value where the state is meant', () =>
    expect(faultsIn('deposit > 1', { ...everything, transitions: false })[0]).toContain('transition-here'))

  test('the state has no value where only constants are known', () =>
    expect(faultsIn('occupied', { ...everything, state: false, transitions: false })[0]).toContain('state-here'))

  test.each([
    ['brackets', '('.repeat(100_000)],
    ['signs', '-'.repeat(9000)],
    ['powers', `2${'^2'.repeat(4000)}`],
    ['negations', `${'not '.repeat(2000)}1`],
    ['length', '1+'.repeat(100_000)],
  ])('an endless run of %s ends in a message, not in a full stack', (_, text) => {
    const begin = performance.now()
    expect(faultsIn(text)).toHaveLength(1)
    expect(performance.now() - begin).toBeLessThan(2000)
  })
})
