import type { StillmarkDocument, StructurePart } from '../../src/jobs/document.js'
import type { JobDetails, JobResult } from '../../src/jobs/job-result.js'

// Results made by hand: the numbers fit one another, nothing here was computed by the program.

const settled: StructurePart = {
  states: 25,
  transitions: 49,
  recurrence: 'positive recurrent',
  grade: 'proved',
  basis: '25 states, one closed class: a finite closed class is positive recurrent (Feller 1968, XV.6)',
  closedClasses: [{ size: 25, period: 1, reachedWith: 1 }],
  transientStates: 0,
  meanTimeToSettle: 0,
}

const details: JobDetails = {
  unit: 'hour',
  time: 'continuous',
  scenarioText: 'stillmark: 1\ntitle: Parcel lockers\n',
  overrides: new Map([['doors', '24']]),
  confidence: 0.95,
  tolerances: { full: { kind: 'relative', value: 0.02 }, mean_occupied: { kind: 'relative', value: 0.02 } },
  claims: { full: { written: '0.115', source: 'capacity spreadsheet, cell F12' } },
  warmUpBasis: 'bias left is 1/40 of the half-width',
  runLengthBasis: 'as given',
  next: 'nothing',
}

const method = 'batch means, 16 replications × 8 batches'

const document: StillmarkDocument = {
  format: 'stillmark/check/1',
  scenario: { title: 'Parcel lockers at a commuter station', file: 'lockers.yaml', sha256: 'ab'.repeat(32) },
  structure: settled,
  exact: {
    method: 'GTH elimination, 25 states',
    measures: {
      mean_occupied: { value: 19.91949400517, errorBound: 8e-15 },
      full: { value: 0.114689155323272, errorBound: 1.4e-16 },
    },
  },
  simulation: {
    seed: 'night-shift-7',
    replications: 16,
    workers: 2,
    warmUp: 31,
    warmUpRule: 'exact bias',
    runLength: 20_000,
    events: 5_412_345,
    seconds: 0.31,
    measures: {
      mean_occupied: { estimate: 19.92123, halfWidth: 0.0163, confidence: 0.95, method },
      full: { estimate: 0.114912, halfWidth: 0.00072, confidence: 0.95, method },
    },
  },
  comparison: {
    verdict: 'agrees',
    measures: {
      mean_occupied: { verdict: 'agrees', difference: 0.00174, tolerance: 0.398, pValue: 0.83 },
      full: { verdict: 'agrees', difference: 0.000223, tolerance: 0.00229, pValue: 0.52 },
    },
    claims: {
      full: {
        verdict: 'agrees',
        claimed: 0.115,
        exact: 0.114689155323272,
        tolerance: 0.00114689155323272,
        source: 'capacity spreadsheet, cell F12',
      },
    },
    findings: [],
  },
}

export const agreeing: JobResult = { document, exitStatus: 0, details }

const claimOff = {
  code: 'claim-off',
  says: 'The claim about full is off: 0.12 is claimed, the exact value is 0.114689.',
  evidence: 'The difference is 0.005311 (4.63 %); 0.001147 is allowed. The simulation agrees with the exact value.',
  next: 'Look for what the claim was worked out from: its rates, its number of places, or its formula.',
} as const

export const claimIsOff: JobResult = {
  document: {
    ...document,
    comparison: {
      ...document.comparison!,
      verdict: 'disagrees',
      claims: {
        full: { verdict: 'disagrees', claimed: 0.12, exact: 0.114689155323272, tolerance: 0.00114689155323272 },
      },
      findings: [claimOff],
    },
  },
  exitStatus: 1,
  details: { ...details, claims: { full: { written: '0.12' } }, next: claimOff.next },
}

export const tooShort: JobResult = {
  document: {
    ...document,
    comparison: {
      verdict: 'undecided',
      measures: {
        ...document.comparison!.measures,
        full: { verdict: 'undecided', difference: 0.0021, tolerance: 0.00229, pValue: 0.4 },
      },
      claims: {},
      findings: [
        {
          code: 'too-short',
          says: 'The run is too short to say whether full agrees.',
          evidence: 'full is known to ± 0.003, and 0.0023 matters.',
          next: 'Run longer: --run-length 90000 would decide.',
        },
      ],
    },
  },
  exitStatus: 3,
  details: { ...details, claims: {}, next: 'Run longer: --run-length 90000 would decide.' },
}

const openStructure: StructurePart = {
  states: null,
  transitions: null,
  recurrence: 'undetermined',
  grade: 'open',
  basis: '`backlog` has no bound, and nothing here decides whether the model settles',
  closedClasses: [],
  transientStates: null,
  meanTimeToSettle: null,
}
const noInterval = 'no interval: the model is not known to have a long-run value'

export const openModel: JobResult = {
  document: {
    ...document,
    scenario: { ...document.scenario, title: 'A night desk loaded to the brim' },
    structure: openStructure,
    exact: null,
    exactAbsent: 'It is open whether the model has a long-run answer.',
    simulation: {
      ...document.simulation!,
      warmUp: 0,
      measures: { mean_backlog: { estimate: 139.0234, halfWidth: null, confidence: 0.95, method: noInterval } },
    },
    comparison: {
      verdict: 'undecided',
      measures: {},
      claims: {},
      findings: [
        {
          code: 'open-class',
          says: 'It is open whether this model has a long-run answer.',
          evidence: 'The simulated averages belong to the length of this run and may go on growing.',
          next: 'Bound the variables that can be bounded ("to:").',
        },
      ],
    },
  },
  exitStatus: 3,
  details: {
    ...details,
    warmUpBasis: 'as given',
    claims: {},
    expect: 'null recurrent',
    next: 'Bound the variables that can be bounded ("to:").',
  },
}

export const contradicted: JobResult = { ...agreeing, exitStatus: 1, details: { ...details, expect: 'transient' } }

export const solvedStates: JobResult = {
  document: {
    format: 'stillmark/solve/1',
    scenario: { title: 'Two lamps', file: 'lamps.yaml', sha256: '0'.repeat(64) },
    structure: {
      ...settled,
      states: 4,
      closedClasses: [
        { size: 2, period: 1, reachedWith: 0.6 },
        { size: 1, period: 1, reachedWith: 0.4 },
      ],
      transientStates: 1,
      meanTimeToSettle: 2,
    },
    exact: {
      method: 'GTH elimination, 3 states in 2 closed classes',
      measures: {
        lit: { value: 2 / 3, errorBound: 1.4e-16 },
        lamps: {
          points: [
            [0, 0.25],
            [1, 0.5],
            [2, 0.25],
          ],
          errorBound: 1e-16,
        },
      },
      distribution: [
        ['dark', 0.25],
        [{ first: 1, second: 0, spare: [2, 0] }, 0.75],
      ],
    },
  },
  exitStatus: 0,
  details: { unit: 'hours', time: 'discrete', scenarioText: '', overrides: new Map(), next: 'nothing' },
}

/** Every text of the scenario tries to break out of where it is shown. */
export const hostile: JobResult = {
  ...agreeing,
  document: {
    ...document,
    scenario: {
      title: '\u001b[31mRed\u001b[0m | `tick` <b>x</b> [a](http://x.y) \u202Eflip\r\nsecond line\u009b2J 漢字',
      file: 'a|b`.yaml',
      sha256: 'ab'.repeat(32),
    },
  },
  details: {
    ...details,
    unit: '\u001b]0;title\u0007hour',
    scenarioText: 'title: "```"\n````\n# heading\n\u001b[2J\u202E',
    claims: { full: { written: '0.115' } },
  },
}
