import { describe, expect, test } from 'vitest'
import { joinedStatus, statusOfFault } from '../../src/cli/exit-status.js'
import { faultsText } from '../../src/cli/fault-text.js'
import { progressText, timeInWords } from '../../src/cli/progress.js'
import type { Fault } from '../../src/errors/stillmark-error.js'

const lines: Record<number, string> = {
  2: 'deposit: { when: occuped < doors }',
  3: '\t漢字: { when: occuped }',
  4: `${'x'.repeat(200)}BAD${'y'.repeat(200)}`,
}
const text = (...faults: Fault[]) => faultsText(faults, (_file, line) => lines[line])

describe('faults', () => {
  test('where, what, the line with the spot marked, what to do', () => {
    expect(
      text({
        code: 'unknown-name',
        where: { file: 'lockers.yaml', line: 2, column: 18, key: 'transitions.deposit.when' },
        text: 'occuped',
        what: '"occuped" is not a constant, quantity or state variable.',
        next: 'Did you mean "occupied"?',
      }),
    ).toBe(`lockers.yaml:2:18  "occuped" is not a constant, quantity or state variable.
      2 | deposit: { when: occuped < doors }
        |                  ^^^^^^^
  Did you mean "occupied"?
`)
  })

  test('the mark stands below the text after a tab and wide characters', () => {
    const [, line, mark] = text({
      code: 'x',
      where: { file: 'a.yaml', line: 3, column: 14 },
      text: 'occuped',
      what: 'No.',
    }).split('\n')
    expect(line).toBe('      3 |  漢字: { when: occuped }')
    expect(mark).toBe('        |                ^^^^^^^') // two columns wider than its characters
  })

  test('a long line is cut around the spot', () => {
    const [, line, mark] = text({
      code: 'x',
      where: { file: 'a.yaml', line: 4, column: 201 },
      text: 'BAD',
      what: 'No.',
    }).split('\n')
    expect(line).toContain('…xxxxxxxxxxxxxxxxxxxxxxxxBADyyy')
    expect(line.length).toBeLessThan(92)
    expect(line.indexOf('BAD')).toBe(mark.indexOf('^^^'))
  })

  test('without a line the key says where; without both the sentence stands alone', () => {
    expect(text({ code: 'x', where: { file: 'a.yaml', key: '--set door' }, what: 'No.' })).toBe(
      'a.yaml (--set door)  No.\n',
    )
    expect(text({ code: 'x', what: 'No.', next: 'Do this.' })).toBe('No.\n  Do this.\n')
  })

  test('a line that is gone is left out', () =>
    expect(text({ code: 'x', where: { file: 'a.yaml', line: 9, column: 1 }, what: 'No.' })).toBe('a.yaml:9:1  No.\n'))

  test('twenty are told, the rest is counted', () => {
    const many = Array.from({ length: 23 }, (_, i): Fault => ({ code: 'x', what: `Fault ${i + 1}.` }))
    expect(
      text(...many)
        .split('\n')
        .slice(-4),
    ).toEqual(['Fault 19.', 'Fault 20.', '… and 3 more faults after these.', ''])
  })

  test('a stranger’s text can not steer the terminal', () =>
    expect(text({ code: 'x', where: { file: 'a\u001b[2J.yaml' }, what: 'No \u001b]0;x\u0007 title.' })).not.toMatch(
      /(?!\n)\p{Cc}/u,
    ))
})

describe('exit statuses', () => {
  test('of several files the first of 130, 2, 4, 1, 3, 0 that occurred', () => {
    const order = [130, 2, 4, 1, 3, 0] as const
    for (let i = 0; i < order.length; i++) expect(joinedStatus([...order.slice(i)].reverse())).toBe(order[i])
  })
  test.each([
    ['input', 2],
    ['limit', 4],
    ['interrupted', 130],
    ['internal', 70],
  ] as const)('%s ends with %i', (kind, status) => expect(statusOfFault(kind)).toBe(status))
})

describe('progress', () => {
  test('a part of a known whole: bar, percentage, amounts, rate, time left', () =>
    expect(progressText({ stage: 'simulating', done: 2.4e6, of: 5.4e6, unit: 'events' }, 2)).toBe(
      'simulating  ███████████░░░░░░░░░░░░░  44 %  2.4 million of 5.4 million events  1.2 million/s  3 s left',
    ))
  test('no whole known: amount and rate', () =>
    expect(progressText({ stage: 'exploring', done: 1_200_000, unit: 'states' }, 0.6)).toBe(
      'listing states  1.2 million states  2.0 million/s',
    ))
  test('nothing known: the stage', () => expect(progressText({ stage: 'pilot' }, 9)).toBe('finding the warm-up'))
  test('a rate is told only once there is something to tell it from', () =>
    expect(progressText({ stage: 'exploring', done: 1000, unit: 'states' }, 0.1)).toBe('listing states  1,000 states'))
  test.each([
    [0.2, '1 s'],
    [42, '42 s'],
    [150, '3 min'],
    [7800, '2 h 10 min'],
  ])('%d seconds are %s', (seconds, words) => expect(timeInWords(seconds)).toBe(words))
})
