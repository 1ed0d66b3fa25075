import { describe, expect, test } from 'vitest'
import { divergenceFindings } from '../../src/comparison/divergence-findings.js'
import type { Classification, Remedy } from '../../src/recurrence/classification.js'

const classified = (rest: Partial<Classification>): Classification => ({
  recurrence: 'transient',
  grade: 'proved',
  basis: 'the drift points outward (Foster 1953)',
  checked: [],
  closedClasses: [],
  remedies: [],
  ...rest,
})
const remedy = (rest: Partial<Remedy> = {}): Remedy => ({
  constant: 'arrivals',
  now: 9,
  threshold: 8,
  steadyWhen: 'below',
  ...rest,
})

describe('code and cause', () => {
  test.each<[name: string, Partial<Classification>, code: string | undefined]>([
    ['transient', {}, 'outward-drift'],
    ['a counter, by its basis', { basis: 'the moves only grow it' }, 'one-way'],
    ['a counter that never falls', { basis: 'a total that never falls' }, 'one-way'],
    ['a counter, by what was checked', { checked: ['served is one-way'] }, 'one-way'],
    ['null recurrent', { recurrence: 'null recurrent' }, 'balanced-drift'],
    ['explosive, before all else', { explosive: true }, 'explosive'],
    ['explosive, where the class is open', { recurrence: 'undetermined', explosive: true }, 'explosive'],
    ['not explosive', { explosive: false }, 'outward-drift'],
    ['positive recurrent', { recurrence: 'positive recurrent' }, undefined],
    ['mixed', { recurrence: 'mixed' }, undefined],
    ['undetermined', { recurrence: 'undetermined' }, undefined],
  ])('%s', (_, rest, code) => {
    expect(divergenceFindings(classified(rest)).map((each) => each.code)).toEqual(code === undefined ? [] : [code])
  })
  test.each([
    [
      'balanced-drift',
      'The model is exactly balanced: it comes back for sure, but the mean time until it does is infinite.',
    ],
    ['outward-drift', 'The model runs away: more comes in than can go out.'],
    ['one-way', 'The model counts one way only: no state is met again, so it has no long-run average.'],
    ['explosive', 'The model makes infinitely many events in finite time.'],
  ])('%s: "%s"', (code, says) => {
    const rest: Record<string, Partial<Classification>> = {
      'balanced-drift': { recurrence: 'null recurrent' },
      'one-way': { basis: 'it can only grow' },
      explosive: { explosive: true },
    }
    expect(divergenceFindings(classified(rest[code] ?? {}))[0]).toMatchObject({ code, says })
  })
})

describe('evidence', () => {
  test('proved is said only of what was proved', () => {
    expect(divergenceFindings(classified({}))[0].evidence).toBe('Proved: the drift points outward (Foster 1953).')
    expect(divergenceFindings(classified({ grade: 'indicated' }))[0].evidence).toBe(
      'Indicated, not proved: the drift points outward (Foster 1953).',
    )
  })
  test('of a balanced model, that a longer warm-up is no help', () => {
    expect(divergenceFindings(classified({ recurrence: 'null recurrent', basis: 'drift 0' }))[0].evidence).toBe(
      "Proved: drift 0. Averages over time go on growing, and a longer warm-up can't help: there is nothing to settle to.",
    )
  })
})

describe('the next action', () => {
  test.each<[name: string, Partial<Classification>, next: string, constant: string | undefined]>([
    [
      'the threshold',
      { remedies: [remedy()] },
      'It is steady while arrivals stays below 8; it is 9. Simulated averages measure the length of the run, nothing else.',
      'arrivals',
    ],
    [
      'on the other side',
      { remedies: [remedy({ constant: 'desks', now: 2, threshold: 2.25, steadyWhen: 'above' })] },
      'It is steady while desks stays above 2.25; it is 2. Simulated averages measure the length of the run, nothing else.',
      'desks',
    ],
    [
      'six digits of it',
      { remedies: [remedy({ now: 1, threshold: 2 / 3 })] },
      'It is steady while arrivals stays below 0.666667; it is 1. Simulated averages measure the length of the run, nothing else.',
      'arrivals',
    ],
    [
      'at exact balance',
      { recurrence: 'null recurrent', remedies: [remedy({ now: 8 })] },
      'It is steady as soon as arrivals is below 8, which it is exactly now. Ask for the time until a given backlog is passed instead of a long-run average.',
      'arrivals',
    ],
    [
      'without a remedy',
      { recurrence: 'null recurrent' },
      'Ask for the time until a given backlog is passed instead of a long-run average.',
      undefined,
    ],
    [
      'of a counter',
      { basis: 'it can only grow' },
      'Measure its rate of growth (a frequency), or take the counter out of the state.',
      undefined,
    ],
    ['of an explosion', { explosive: true }, 'Bound the rates: no plant does this.', undefined],
    [
      'of an explosion with a remedy',
      { explosive: true, remedies: [remedy()] },
      'Bound the rates: no plant does this. It is steady while arrivals stays below 8; it is 9.',
      'arrivals',
    ],
    [
      'the nearest of several',
      { remedies: [remedy(), remedy({ constant: 'desks' })] },
      'It is steady while arrivals stays below 8; it is 9. Simulated averages measure the length of the run, nothing else.',
      'arrivals',
    ],
  ])('%s', (_, rest, next, constant) => {
    const [finding] = divergenceFindings(classified(rest))
    expect(finding.next).toBe(next)
    expect(finding.constant).toBe(constant)
    expect('constant' in finding).toBe(constant !== undefined)
  })
})
