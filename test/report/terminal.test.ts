import stringWidth from 'string-width'
import { describe, expect, test } from 'vitest'
import type { JobResult } from '../../src/jobs/job-result.js'
import { type Paint, terminalText } from '../../src/report/terminal.js'
import { agreeing, claimIsOff, contradicted, hostile, openModel, solvedStates, tooShort } from './results.js'

// The layouts are snapshots: they were looked at and found good. A change is looked at and copied, not argued with.

const all: Record<string, JobResult> = {
  agreeing,
  claimIsOff,
  contradicted,
  hostile,
  openModel,
  solvedStates,
  tooShort,
}

describe('layouts', () => {
  test('agreement: the answer first, the table, what it rests on, nothing to do', () => {
    expect(`\n${terminalText(agreeing)}`).toBe(`
Parcel lockers at a commuter station

The simulation agrees with the exact long-run answer, and so does the claim.

  measure           exact  simulated            differs  allowed
  mean_occupied   19.9195     19.921 ± 0.016      0.0 %      2 %  agrees
  full           0.114689    0.11491 ± 0.00072    0.2 %      2 %  agrees
  claim: full    0.114689      0.115              0.3 %      1 %  agrees
      capacity spreadsheet, cell F12

  steady state   yes, proved: 25 states, one closed class: a finite closed class
                 is positive recurrent (Feller 1968, XV.6)
  exact by       GTH elimination, 25 states
  warm-up        31 hours deleted before the 20,000 observed; bias left is 1/40
                 of the half-width
  run            16 replications of 20,000 hours, seed night-shift-7, 5.4
                 million events, 0.31 s

Next: nothing.
`)
  })

  test('a claim that is off: said in the first sentence, explained below, followed by what to do', () => {
    const text = terminalText(claimIsOff)
    expect(text).toContain('The simulation agrees with the exact long-run answer, but the claim is off.\n')
    expect(text).toContain('  claim: full    0.114689       0.12              4.6 %      1 %  disagrees\n')
    expect(text).toContain(`
  The claim about full is off: 0.12 is claimed, the exact value is 0.114689.
    The difference is 0.005311 (4.63 %); 0.001147 is allowed. The simulation
    agrees with the exact value.

Next: Look for what the claim was worked out from: its rates, its number of
places, or its formula.
`)
  })

  test('a model without an answer: no exact column, no empty columns, the reason said once', () => {
    expect(`\n${terminalText(openModel)}`).toBe(`
A night desk loaded to the brim

It is open whether this model has a long-run answer, so nothing can be compared.

  measure       simulated
  mean_backlog      139.0
  No intervals: the model is not known to have a long-run value.

  steady state   open: \`backlog\` has no bound, and nothing here decides whether
                 the model settles
  expected       null recurrent, that stays open
  warm-up        none, as given
  run            16 replications of 20,000 hours, seed night-shift-7, 5.4
                 million events, 0.31 s

  It is open whether this model has a long-run answer.
    The simulated averages belong to the length of this run and may go on
    growing.

Next: Bound the variables that can be bounded ("to:").
`)
  })

  test('solve: more digits, bounds rounded up, distributions and states as small lists', () => {
    expect(`\n${terminalText(solvedStates)}`).toBe(`
Two lamps

The model settles in one of 2 closed classes, and chance decides in which. Its
long-run values, exactly:

  measure           exact  error at most
  lit      0.666666666667          2e-16
  lamps          3 values          1e-16

  lamps
       0  █████       0.2500
       1  ██████████  0.5000
       2  █████       0.2500

  share of time in each state
    dark                          ███▍        0.2500
    first 1, second 0, spare 2 0  ██████████  0.7500

  steady state   yes, proved: 25 states, one closed class: a finite closed class
                 is positive recurrent (Feller 1968, XV.6)
  ends           with probability 0.6 in a 2-state class, 0.4 in a single-state
                 class
  settles        after 2 hours on average
  exact by       GTH elimination, 3 states in 2 closed classes

Next: nothing.
`)
  })

  test('an expectation that is contradicted stands in the first sentence and in the last', () => {
    const text = terminalText(contradicted)
    expect(text).toContain('\nThe model is positive recurrent, not transient as the file expects. The\n')
    expect(text).toMatch(/\nNext: correct "expect" in the file, or the model: they contradict each other\.\n$/)
  })

  test('undecided: which measure, and what would decide', () => {
    const text = terminalText(tooShort)
    expect(text).toContain('Undecided: the run does not show whether full agrees with the exact answer.')
    expect(text).toMatch(/\nNext: Run longer: --run-length 90000 would decide\.\n$/)
  })
})

describe('on any screen', () => {
  test.each(Object.entries(all))('%s fits 80 columns', (_name, result) => {
    for (const line of terminalText(result).split('\n')) expect(stringWidth(line)).toBeLessThanOrEqual(80)
  })

  test.each([agreeing, contradicted, hostile])('a result without findings fits 24 lines', (result) => {
    expect(terminalText(result).trimEnd().split('\n').length).toBeLessThanOrEqual(24)
  })

  test.each(Object.entries(all))('%s holds no control character when it is not painted', (_name, result) => {
    expect(terminalText(result)).not.toMatch(/(?!\n)\p{Cc}|[\u202A-\u202E\u2066-\u2069]/u)
  })

  test('painted and unpainted show the same words in the same columns', () => {
    const marked = (open: string) => (text: string) => `\u001b[${open}m${text}\u001b[0m`
    const paint: Paint = {
      strong: marked('1'),
      quiet: marked('2'),
      good: marked('32'),
      bad: marked('31'),
      open: marked('33'),
    }
    for (const result of Object.values(all)) {
      // biome-ignore lint/suspicious/noControlCharactersInRegex: the marks are taken out again
      expect(terminalText(result, 80, paint).replace(/\u001b\[\d+m/g, '')).toBe(terminalText(result, 80))
    }
  })

  test('agreement is painted good, disagreement bad, the undecided open', () => {
    const paint: Paint = {
      strong: (text) => text,
      quiet: (text) => text,
      good: (text) => `good(${text})`,
      bad: (text) => `bad(${text})`,
      open: (text) => `open(${text})`,
    }
    expect(terminalText(agreeing, 80, paint)).toContain('good(The simulation agrees')
    expect(terminalText(claimIsOff, 80, paint)).toContain('bad(The simulation agrees')
    expect(terminalText(claimIsOff, 80, paint)).toContain('bad(disagrees)')
    expect(terminalText(tooShort, 80, paint)).toContain('open(Undecided')
    expect(terminalText(contradicted, 80, paint)).toContain('bad(The model is positive recurrent, not transient')
  })

  test('a name that is too long is cut, so the table stays in its columns', () => {
    const name = 'a_measure_whose_name_goes_on_and_on_and_on'
    const { exact, simulation, comparison } = agreeing.document
    const renamed: JobResult = {
      ...agreeing,
      document: {
        ...agreeing.document,
        exact: { ...exact!, measures: { [name]: exact!.measures.full } },
        simulation: { ...simulation!, measures: { [name]: simulation!.measures.full } },
        comparison: { ...comparison!, measures: { [name]: comparison!.measures.full }, claims: {} },
      },
    }
    const text = terminalText(renamed)
    expect(text).toContain('  a_measure_whose_name…  0.114689')
    for (const line of text.split('\n')) expect(stringWidth(line)).toBeLessThanOrEqual(80)
  })
})
