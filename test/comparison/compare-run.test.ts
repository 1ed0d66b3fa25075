import { describe, expect, test } from 'vitest'
import type { ClaimToJudge } from '../../src/comparison/compare-claim.js'
import type { Prediction } from '../../src/comparison/compare-measure.js'
import { adjustedConfidence, compareRun, type RunToCompare } from '../../src/comparison/compare-run.js'
import type { StructureFacts } from '../../src/comparison/structure-findings.js'
import type { Finding } from '../../src/comparison/verdict.js'
import { estimateMean } from '../../src/estimation/batch-means.js'
import type { Estimate } from '../../src/estimation/estimate.js'

const found = (estimate: number, halfWidth: number): Estimate => ({
  estimate,
  halfWidth,
  standardError: halfWidth / 2.1314495455597755,
  degreesOfFreedom: 15,
  confidence: 0.95,
  method: 'replication means, 16 replications',
})
const exact = (values: Record<string, number>): NonNullable<RunToCompare['exact']> => ({
  method: 'by hand',
  measures: Object.fromEntries(Object.entries(values).map(([name, value]) => [name, { value, errorBound: 0 }])),
})
const predicted = (more: Partial<Prediction> = {}): Prediction => ({
  halfWidth: 0.01,
  correlationTime: 2,
  slow: false,
  ...more,
})
const claim = (measure: string, value: number, more: Partial<ClaimToJudge> = {}): ClaimToJudge => ({
  measure,
  value,
  written: String(value),
  lastDigit: 0.001,
  ...more,
})
const base = {
  tolerance: { kind: 'relative', value: 0.02 },
  claims: [],
  predictions: {},
  run: { unit: 'hour', replications: 16, runLength: 1000, warmUp: 50 },
} as const
const compare = (more: Partial<RunToCompare>) => compareRun({ ...base, adjusted: {}, ...more })
const codes = (findings: readonly Finding[]): string[] => findings.map(({ code }) => code)

test('twenty measures at 95 % together are judged at 99.75 % each, one at 95 %, none at 95 %', () => {
  expect(adjustedConfidence(0.95, 20)).toBeCloseTo(0.9975, 15)
  expect(adjustedConfidence(0.95, 1)).toBeCloseTo(0.95, 15)
  expect(adjustedConfidence(0.95, 0)).toBeCloseTo(0.95, 15)
})

describe('the verdict on all', () => {
  const right = { full: found(1, 0.01) }
  test('all agree: agrees, and nothing is to be said', () => {
    expect(compare({ exact: exact({ full: 1 }), adjusted: right })).toEqual({
      verdict: 'agrees',
      measures: { full: { verdict: 'agrees', difference: 0, tolerance: 0.02, pValue: 1 } },
      claims: {},
      findings: [],
    })
  })
  test('one undecided: undecided; one that disagrees beats it', () => {
    const adjusted = { ...right, wide: found(1, 0.1) }
    expect(compare({ exact: exact({ full: 1, wide: 1 }), adjusted }).verdict).toBe('undecided')
    const off = compare({ exact: exact({ full: 1.1, wide: 1 }), adjusted })
    expect(off.verdict).toBe('disagrees')
    expect(codes(off.findings)).toEqual(['simulation-off', 'too-short'])
  })
  test('a claim counts like a measure', () => {
    const wrong = compare({ exact: exact({ full: 1 }), adjusted: right, claims: [claim('full', 1.03)] })
    expect(wrong.verdict).toBe('disagrees')
    expect(wrong.claims.full).toMatchObject({ verdict: 'disagrees', claimed: 1.03, exact: 1 })
    expect(compare({ exact: exact({ full: 1 }), adjusted: right, claims: [claim('full', 1)] }).verdict).toBe('agrees')
  })
  test('without an exact answer nothing agrees, whatever the claims', () => {
    expect(compare({ adjusted: right }).verdict).toBe('undecided')
    const claims = [claim('full', 1, { tolerance: { kind: 'absolute', value: 0.5 } })]
    const agreeing = compare({ adjusted: right, claims })
    expect(agreeing.claims.full.verdict).toBe('agrees')
    expect(agreeing.verdict).toBe('undecided')
    expect(compare({ adjusted: right, claims: [claim('full', 2)] }).verdict).toBe('disagrees')
  })
  test('a measure without an exact value is left out', () => {
    expect(compare({ exact: exact({ full: 1 }), adjusted: { ...right, other: found(5, 1) } }).measures).toEqual({
      full: expect.anything(),
    })
  })
})

describe('what is said of a claim', () => {
  const adjusted = { full: found(0.1147, 0.0005) }
  test('off, while the simulation agrees with the exact value', () => {
    const { findings } = compare({
      exact: exact({ full: 0.1146891553 }),
      adjusted,
      claims: [claim('full', 0.118, { source: 'capacity sheet' })],
    })
    expect(findings).toEqual([
      {
        code: 'claim-off',
        says: 'The claim about full is off: 0.118 is claimed (capacity sheet), the exact value is 0.114689.',
        evidence: 'The difference is 0.003311 (2.89 %); 0.0005 is allowed. The simulation agrees with the exact value.',
        next: 'Look for what the claim was worked out from: its rates, its number of places, or its formula.',
      },
    ])
  })
  test('off from an exact 0, with a simulation that says nothing', () => {
    const { findings } = compare({ exact: exact({ full: 0 }), adjusted: {}, claims: [claim('full', 0.5)] })
    expect(findings[0]).toMatchObject({
      says: 'The claim about full is off: 0.5 is claimed, the exact value is 0.',
      evidence: 'The difference is 0.5; 0.0005 is allowed.',
    })
  })
  test('off from what is simulated', () => {
    const { findings } = compare({ adjusted, claims: [claim('full', 0.25)] })
    expect(findings[0]).toMatchObject({
      code: 'claim-off',
      says: 'The claim about full is off: 0.25 is claimed, the simulation gives 0.1147.',
      evidence: 'The difference is 0.1353 (118 %); 0.0005 is allowed.',
    })
  })
  test('on the border', () => {
    const { verdict, findings } = compare({
      exact: { method: '', measures: { full: { value: 1, errorBound: 1e-6 } } },
      adjusted: { full: found(1, 0.001) },
      claims: [claim('full', 1.0005)],
    })
    expect(verdict).toBe('undecided')
    expect(findings).toEqual([
      {
        code: 'too-short',
        says: 'The claim about full lies on the border of its tolerance, closer than the exact value is known.',
        evidence: '1.0005 is claimed, the exact value is 1, 0.0005 is allowed.',
        next: 'Give the claim with one more digit, or another tolerance.',
      },
    ])
  })
})

describe('what is said of the run', () => {
  test('off: both values, and what to do', () => {
    const { findings } = compare({
      exact: exact({ full: 1, busy: 2 }),
      adjusted: { full: found(1.1, 0.01), busy: found(2.2, 0.025) },
    })
    expect(findings).toEqual([
      {
        code: 'simulation-off',
        says: 'The simulation gives another long-run value than the model has: full and busy.',
        evidence:
          'full: simulated 1.1 ± 0.01, exact 1; busy: simulated 2.2 ± 0.025, exact 2 (intervals widened for the number of measures).',
        next: 'One of the two is wrong. Repeat with another --seed; if it stays, report it with the scenario file.',
      },
    ])
  })
  test('too short: the half-width falls with the root of the length and should be half the tolerance', () => {
    const { findings } = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1, 0.05) } })
    expect(findings).toEqual([
      {
        code: 'too-short',
        says: 'The run is too short to say whether full agrees.',
        evidence: 'full is known to ± 0.05, and 0.02 matters.',
        next: 'Run longer: --run-length 25000 should decide. Or allow a larger difference with --tolerance.',
      },
    ])
  })
  test('the neediest measure sets the length, and the exact spread where it is larger', () => {
    const { findings } = compare({
      exact: exact({ full: 1, busy: 1, idle: 1 }),
      adjusted: { full: found(1, 0.05), busy: found(1, 0.1), idle: found(1, 0.025) },
      predictions: { busy: predicted({ halfWidth: 0.15 }), full: predicted({ halfWidth: 0.01 }) },
    })
    expect(findings[0].says).toBe('The run is too short to say whether full, busy and idle agree.')
    expect(findings[0].next).toMatch(/--run-length 230000 should/)
  })
  test('at least twice as long', () => {
    const { findings } = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1.0125, 0.01) } })
    expect(findings[0].next).toMatch(/--run-length 2000 /)
  })
  test('no affordable run decides: a larger tolerance', () => {
    const { findings } = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1, 1.01) } })
    expect(findings[0].next).toBe('Allow a larger difference with --tolerance: no affordable run decides this.')
    expect(compare({ exact: exact({ full: 1 }), adjusted: { full: found(1, 1) } }).findings[0].next).toMatch(
      /--run-length 10000000 /,
    )
  })
  test('of several parts, replications are what counts', () => {
    const { findings } = compare({
      exact: exact({ full: 1 }),
      adjusted: { full: found(1, 0.05) },
      structure: parts(0.5, 0.5),
    })
    expect(codes(findings)).toEqual(['start-dependent', 'too-short'])
    expect(findings[1].next).toBe('Run more replications: --replications 400 should decide.')
    const reachable = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1, 0.05) }, structure: parts(1, 0) })
    expect(reachable.findings[0].next).toMatch(/^Run longer/)
  })
  test('without an interval: why', () => {
    const lone = estimateMean(
      Float64Array.from({ length: 32 }, (_, i) => i),
      1,
      0.95,
    )
    const { findings } = compare({ exact: exact({ full: 1 }), adjusted: { full: lone } })
    expect(findings[0]).toMatchObject({
      code: 'too-short',
      evidence:
        'full has no interval: the batches of the one replication hang together: run longer, or with more replications.',
    })
    const never = estimateMean(new Float64Array(16).fill(1), 16, 0.95)
    expect(codes(compare({ exact: exact({ full: 0.5 }), adjusted: { full: never } }).findings)).toEqual(['too-short'])
  })
  test('a quantile lies between values, and no law says for how long', () => {
    const quantile = { ...found(2, 1), low: 2, high: 3, pValueOf: () => 1 }
    const { findings } = compare({ exact: exact({ p95: 2 }), adjusted: { p95: quantile } })
    expect(findings[0]).toMatchObject({
      evidence: 'p95 lies between 2 and 3.',
      next: 'Run longer: --run-length 4000 should decide. Or allow a larger difference with --tolerance.',
    })
  })
  test('never met: rare, not short', () => {
    const never = estimateMean(new Float64Array(16), 16, 0.95)
    const far = compare({ exact: exact({ full: 1e-9 }), adjusted: { full: never } })
    expect(far.verdict).toBe('undecided')
    expect(far.findings).toEqual([
      {
        code: 'rare-states',
        says: 'What full measures is so rare that the run never met it.',
        evidence: 'Its exact value is 1e-9; the run observed 16,000 hours in all.',
        next: 'Take the exact value: no run of a length that can be afforded shows it.',
      },
    ])
    const near = compare({
      exact: exact({ full: 0.5 }),
      adjusted: { full: never },
      predictions: { full: predicted({ halfWidth: 0.05 }) },
    })
    expect(near.findings[0].next).toBe('Take the exact value, or run longer: --run-length 100000 should decide.')
  })
  test('a percentage of 0', () => {
    const { findings } = compare({ exact: exact({ balance: 0 }), adjusted: { balance: found(0.01, 0.1) } })
    expect(findings).toEqual([
      {
        code: 'too-short',
        says: 'The exact value of balance is 0, and a tolerance in percent allows nothing there.',
        evidence: 'balance: simulated 0.01 ± 0.1, and 0 lies inside.',
        next: 'Give the difference that matters as a plain number, --tolerance 0.01 say.',
      },
    ])
  })
  test('harmless: visible, but small', () => {
    const { verdict, findings } = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1.01, 0.01) } })
    expect(verdict).toBe('agrees')
    expect(findings).toEqual([])
    const seen = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1.0125, 0.005) } })
    expect(seen.verdict).toBe('agrees')
    expect(seen.findings).toEqual([
      {
        code: 'harmless-difference',
        says: 'The simulation of full is visibly off, but by less than matters.',
        // Student's tail of 5.33 standard errors at 15 degrees of freedom, both sides: 8.4e-5.
        evidence: 'It is off by 0.0125 (1.25 %), 0.02 is allowed; chance alone does this once in 12,000 runs.',
        next: 'Nothing, if that tolerance is yours. Otherwise repeat with another --seed and a smaller --tolerance.',
      },
    ])
    const sure = compare({ exact: exact({ full: 1 }), adjusted: { full: found(1.0125, 0.0005) } })
    expect(sure.findings[0].evidence).toMatch(/chance alone does this in no run\.$/)
  })
  test('slow mixing: how many looks a replication holds, and how many it should', () => {
    const { findings } = compare({
      exact: exact({ full: 1, busy: 1 }),
      adjusted: { full: found(1.2, 0.1), busy: found(1, 0.01) },
      predictions: {
        full: predicted({ correlationTime: 100, slow: true, halfWidth: 0.1 }),
        busy: predicted({ correlationTime: 60, slow: true }),
      },
    })
    expect(codes(findings)).toEqual(['slow-mixing', 'too-short'])
    expect(findings[0]).toMatchObject({
      says: 'The model forgets so slowly that a replication of 1000 hours holds few independent looks at full and busy.',
      evidence:
        'What is seen at two moments hangs together over 100 hours (integrated correlation time, exact); a replication lasts 10 of these.',
      next: 'Let each replication observe at least 20 of them: --run-length 2000.',
    })
  })
  test('an interval too narrow to be believed', () => {
    const { verdict, findings } = compare({
      exact: exact({ full: 1 }),
      adjusted: { full: found(1.01, 0.001) },
      predictions: { full: predicted({ halfWidth: 0.1 }) },
    })
    expect(verdict).toBe('undecided')
    expect(findings).toEqual([
      {
        code: 'batches-short',
        says: 'The interval of full is too narrow to be believed.',
        evidence:
          'Its half-width is 1 % of the one that the exact variance gives for this run: the run has not shown how far full swings.',
        next: 'Run longer, so that each replication sees the slow swings several times.',
      },
    ])
  })
  test('the start is still seen', () => {
    const adjusted = { full: found(1.1, 0.01) }
    const { verdict, findings } = compare({
      exact: exact({ full: 1 }),
      adjusted,
      predictions: { full: predicted({ bias: 0.095 }) },
    })
    expect(verdict).toBe('undecided')
    expect(findings).toEqual([
      {
        code: 'bias-left',
        says: 'The start is still seen in full: the warm-up of 50 hours is too short.',
        evidence: 'A bias of 0.095 is left after it (exact), and the simulation is off by 0.1.',
        next: 'Delete more: --warm-up 100.',
      },
    ])
    const slower = compare({
      exact: exact({ full: 1 }),
      adjusted,
      predictions: { full: predicted({ bias: 0.095, correlationTime: 40 }) },
    })
    expect(slower.findings[0].next).toBe('Delete more: --warm-up 200.')
  })
  test('the warm-up rule refused', () => {
    const { findings } = compare({
      exact: exact({ full: 1 }),
      adjusted: { full: found(1, 0.01) },
      run: { ...base.run, unsettled: 'its best cut lies late' },
    })
    expect(findings).toEqual([
      {
        code: 'bias-left',
        says: 'The warm-up rule found no point from which on the pilot runs have settled.',
        evidence: 'Its best cut lies late. The longest pilot tried is deleted: 50 hours.',
        next: 'Give a warm-up that you can defend with --warm-up, or look whether the model settles at all.',
      },
    ])
  })
})

describe('order', () => {
  test('a cause comes first, and a wrong claim before what the run can not show', () => {
    const cause: Finding = { code: 'open-class', says: 'open', evidence: '', next: '' }
    const { findings } = compare({
      exact: exact({ full: 1, busy: 1, idle: 1, rare: 1e-9 }),
      adjusted: {
        full: found(1.1, 0.01),
        busy: found(1, 0.1),
        idle: found(1.0125, 0.005),
        rare: estimateMean(new Float64Array(16), 16, 0.95),
      },
      claims: [claim('full', 2)],
      structure: { ...parts(0.5, 0.5), classes: parts(0.5, 0.5).classes.map((each) => ({ ...each, period: 2 })) },
      causes: [cause],
    })
    expect(codes(findings)).toEqual([
      'open-class',
      'start-dependent',
      'claim-off',
      'simulation-off',
      'rare-states',
      'too-short',
      'harmless-difference',
      'periodic',
      'periodic',
    ])
  })
})

function parts(...reachedWith: number[]): StructureFacts {
  return {
    classes: reachedWith.map((probability, i) => ({
      size: 2,
      period: 1,
      reachedWith: probability,
      example: `part ${i + 1}`,
      measures: { full: i },
    })),
    transientStates: 1,
    meanTimeToSettle: 2,
  }
}
