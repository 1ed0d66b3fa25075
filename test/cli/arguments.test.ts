import { describe, expect, test } from 'vitest'
import * as read from '../../src/cli/arguments.js'

const refusal = (parse: () => unknown): string => {
  try {
    return `took it: ${JSON.stringify(parse())}`
  } catch (error) {
    return (error as Error).message
  }
}

describe('what an option takes', () => {
  test.each<[string, (text: string) => unknown, string, unknown]>([
    ['--confidence', read.confidence, '0.95', 0.95],
    ['--confidence', read.confidence, '95%', 0.95],
    ['--confidence', read.confidence, '19/20', 0.95],
    ['--tolerance', read.tolerance, '2%', { kind: 'relative', value: 0.02 }],
    ['--tolerance', read.tolerance, '2 %', { kind: 'relative', value: 0.02 }],
    ['--tolerance', read.tolerance, '0.5', { kind: 'absolute', value: 0.5 }],
    ['--warm-up', read.warmUp, 'auto', 'auto'],
    ['--warm-up', read.warmUp, 'mser', 'mser'],
    ['--warm-up', read.warmUp, '0', 0],
    ['--run-length', read.runLength, '5e6', 5e6],
    ['--replications', read.replications, '32', 32],
    ['--workers', read.workers, '1', 1],
    ['--max-states', read.maxStates, '5e6', 5_000_000],
    ['--max-memory', read.memory, '4GB', 4e9],
    ['--max-memory', read.memory, '512 MiB', 512 * 2 ** 20],
    ['--time-limit', read.duration, '10min', 600],
    ['--time-limit', read.duration, '1.5h', 5400],
    ['--time-limit', read.duration, '90s', 90],
    ['--seed', read.seed, 'night shift 7', 'night shift 7'],
  ])('%s reads %s', (_option, parse, text, value) => expect(parse(text)).toEqual(value))
})

describe('what an option refuses, and what it says is allowed', () => {
  test.each<[string, (text: string) => unknown, string, string]>([
    ['--confidence', read.confidence, '95', 'It lies between 0 and 1. Did you mean 95%?'],
    ['--confidence', read.confidence, '1', 'It lies between 0 and 1: 0.95 or 95%.'],
    ['--confidence', read.confidence, '0', 'It lies between 0 and 1: 0.95 or 95%.'],
    ['--confidence', read.confidence, 'high', 'A share between 0 and 1: 0.95 or 95%.'],
    [
      '--tolerance',
      read.tolerance,
      '0',
      'Write 2% (of the exact value), or a number above 0 in the unit of the measures.',
    ],
    [
      '--tolerance',
      read.tolerance,
      '-1%',
      'Write 2% (of the exact value), or a number above 0 in the unit of the measures.',
    ],
    ['--warm-up', read.warmUp, '-1', 'A number of time units of 0 or more, or one of auto, mser.'],
    ['--warm-up', read.warmUp, 'geweke', 'A number of time units of 0 or more, or one of auto, mser.'],
    ['--run-length', read.runLength, '-3', 'A number of time units above 0.'],
    ['--run-length', read.runLength, '1e999', 'A number of time units above 0.'],
    ['--run-length', read.runLength, '10%', 'A number of time units above 0.'],
    ['--workers', read.workers, '0', 'The number of threads: a whole number from 1 to 1,024.'],
    ['--workers', read.workers, '2.5', 'The number of threads: a whole number from 1 to 1,024.'],
    ['--replications', read.replications, '', 'The number of runs: a whole number from 1 to 1,000,000.'],
    ['--max-memory', read.memory, '4', 'A size with its unit: 4GB, 512MB, 2GiB.'],
    ['--max-memory', read.memory, '0GB', 'A size with its unit: 4GB, 512MB, 2GiB.'],
    ['--time-limit', read.duration, '10', 'A time with its unit: 90s, 10min, 2h (up to 596h).'],
    ['--time-limit', read.duration, '1000h', 'A time with its unit: 90s, 10min, 2h (up to 596h).'],
    ['--seed', read.seed, ' ', 'A phrase of at least one character.'],
  ])('%s %s', (_option, parse, text, message) => expect(refusal(() => parse(text))).toBe(message))
})

describe('--set', () => {
  test('gathers constants, blanks around them aside', () => {
    const first = read.setConstant('doors = 30', undefined)
    expect([...read.setConstant('mean=1/3', first)]).toEqual([
      ['doors', '30'],
      ['mean', '1/3'],
    ])
  })
  test.each(['doors', 'doors=', '=30', ''])('%j is no assignment', (text) =>
    expect(refusal(() => read.setConstant(text, undefined))).toBe('Write it as name=value: --set doors=30.'),
  )
  test('a constant that is set twice is refused', () =>
    expect(refusal(() => read.setConstant('doors=4', new Map([['doors', '3']])))).toBe('"doors" is set twice.'))
})
