import { readFileSync } from 'node:fs'
import {
  add,
  divide,
  type Fraction,
  fraction,
  fractionOfText,
  multiply,
  one,
  subtract,
} from '../../src/numbers/fraction.js'
import { averageOf, type Move, solveTable } from '../stationary/table-chain.js'

// Every finite case of the references, built as a chain by table with the numbers as written there, kept as fractions.

export interface Check {
  readonly what: string
  /** As printed in the reference. */
  readonly expected: string
  readonly computed: number
  /** The program's own bound on its error, where it gives one. */
  readonly errorBound?: number
  /** Absolute tolerance of the source where it prints few digits; else 1e-12 relative. */
  readonly within?: number
}

export interface FiniteCase {
  readonly id: string
  readonly source: string
  readonly checks: () => Check[]
}

interface Reference {
  readonly id: string
  readonly source: string
  // biome-ignore lint/suspicious/noExplicitAny: the shape differs from case to case
  readonly model: any
  // biome-ignore lint/suspicious/noExplicitAny: as above
  readonly values: any
}

export const referencesOf = (file: string): Reference[] =>
  JSON.parse(readFileSync(new URL(`references/${file}.json`, import.meta.url), 'utf8')).cases

const number = (text: string | number): Fraction => fractionOfText(String(text)) as Fraction
const times = (a: Fraction, k: number): Fraction => multiply(a, fraction(k))
const range = (n: number): number[] => Array.from({ length: n }, (_, k) => k)

/** Moves of a birth-death chain on 0 … top. */
function birthDeath(top: number, birth: (k: number) => Fraction, death: (k: number) => Fraction): Move[] {
  return range(top + 1).flatMap((k): Move[] => [
    ...(k < top ? [[k, k + 1, birth(k)] as Move] : []),
    ...(k > 0 ? [[k, k - 1, death(k)] as Move] : []),
  ])
}

const withStay = (size: number, moves: readonly Move[]): Move[] => [
  ...moves,
  ...range(size).flatMap((k): Move[] => {
    const rest = moves.reduce((left, [from, , p]) => (from === k ? subtract(left, p as Fraction) : left), one)
    return rest.numerator === 0n ? [] : [[k, k, rest]]
  }),
]

const movesOfMatrix = (matrix: readonly (readonly string[])[]): Move[] =>
  matrix.flatMap((row, i) => row.flatMap((p, j): Move[] => (number(p).numerator === 0n ? [] : [[i, j, number(p)]])))

/** Long-run means with their bounds, one for each list of values by state. */
function means(
  time: 'continuous' | 'discrete',
  size: number,
  moves: readonly Move[],
  wanted: readonly (readonly [what: string, expected: string, values: readonly number[], within?: number])[],
): Check[] {
  const { answer } = solveTable(time, size, moves, {
    measures: wanted.map(([, , values], k) => averageOf(`m${k}`, values)),
  })
  return wanted.map(([what, expected, , within], k) => {
    const { value, errorBound } = answer.measures[`m${k}`] as { value: number; errorBound: number }
    return { what, expected, computed: value, errorBound, within }
  })
}

function shares(
  time: 'continuous' | 'discrete',
  size: number,
  moves: readonly Move[],
  expected: readonly string[],
): Check[] {
  const { answer } = solveTable(time, size, moves)
  return expected.map((each, k) => {
    const computed = answer.shares?.[k] as number
    return {
      what: `share of state ${k}`,
      expected: each,
      computed,
      errorBound: (answer.sharesRelativeError as number) * computed,
    }
  })
}

const counts = (size: number) => range(size)
const only = (size: number, ...states: number[]) => range(size).map((k) => (states.includes(k) ? 1 : 0))

/** Expected time until `until` from `from`: the chain with `until` made absorbing. */
function passage(
  time: 'continuous' | 'discrete',
  size: number,
  moves: readonly Move[],
  from: number,
  until: readonly number[],
): number {
  const stopped: Move[] = moves.filter(([source]) => !until.includes(source))
  if (time === 'discrete') for (const state of until) stopped.push([state, state, 1])
  return solveTable(time, size, stopped, { start: from }).structure.meanTimeToSettle
}

function classic({ id, model, values }: Reference): Check[] {
  if (id.startsWith('ehrenfest')) {
    const d: number = model.balls
    const moves = birthDeath(
      d,
      (k) => fraction(d - k, d),
      (k) => fraction(k, d),
    )
    const { structure } = solveTable('discrete', d + 1, moves)
    const checks = shares('discrete', d + 1, moves, values.pi)
    return [
      ...checks,
      { what: 'recurrence time of 0', expected: String(values.recurrenceTimeOf0), computed: 1 / checks[0].computed },
      { what: 'period', expected: String(values.period), computed: structure.closedClasses[0].period, within: 0 },
    ]
  }
  if (id.startsWith('bernoulli-laplace')) {
    const { red, black, urn1 } = model
    const size = values.pi.length
    const lost = red + black - urn1 // balls in the other urn
    const moves = withStay(
      size,
      birthDeath(
        size - 1,
        (x) => multiply(fraction(urn1 - x, urn1), fraction(red - x, lost)),
        (x) => multiply(fraction(x, urn1), fraction(lost - (red - x), lost)),
      ),
    )
    return [
      ...shares('discrete', size, moves, values.pi),
      ...means('discrete', size, moves, [['mean', values.mean, counts(size)]]),
    ]
  }
  if (id.startsWith('reflecting-walk')) {
    const size = values.pi.length
    const moves = withStay(
      size,
      birthDeath(
        size - 1,
        () => number(model.up),
        () => number(model.down),
      ),
    )
    return [
      ...shares('discrete', size, moves, values.pi),
      ...means('discrete', size, moves, [['mean', values.mean, counts(size)]]),
    ]
  }
  if (id.startsWith('knight')) {
    const jumps = [-2, -1, 1, 2].flatMap((a) =>
      [-2, -1, 1, 2].filter((b) => Math.abs(a) !== Math.abs(b)).map((b) => [a, b]),
    )
    const moves = range(64).flatMap((k): Move[] => {
      const reach = jumps
        .map(([a, b]) => [(k >> 3) + a, (k & 7) + b])
        .filter(([row, column]) => row >= 0 && row < 8 && column >= 0 && column < 8)
      return reach.map(([row, column]) => [k, row * 8 + column, fraction(1, reach.length)])
    })
    const { answer, structure } = solveTable('discrete', 64, moves)
    return [
      {
        what: 'recurrence time of a corner',
        expected: values.recurrenceTimeCorner,
        computed: 1 / (answer.shares?.[0] as number),
      },
      { what: 'period', expected: String(values.period), computed: structure.closedClasses[0].period, within: 0 },
    ]
  }
  const { vowelVowel, vowelConsonant, consonantVowel, consonantConsonant } = model.counts
  const vowels = vowelVowel + vowelConsonant
  const consonants = consonantVowel + consonantConsonant
  const moves: Move[] = [
    [0, 0, fraction(vowelVowel, vowels)],
    [0, 1, fraction(vowelConsonant, vowels)],
    [1, 0, fraction(consonantVowel, consonants)],
    [1, 1, fraction(consonantConsonant, consonants)],
  ]
  return shares('discrete', 2, moves, [values.stationaryVowel])
}

function structureCase({ id, model, values }: Reference): Check[] {
  const fact = (what: string, expected: unknown, computed: unknown): Check => ({
    what: `${what} ${JSON.stringify(computed)}`,
    expected: '1',
    computed: JSON.stringify(expected) === JSON.stringify(computed) ? 1 : 0,
    within: 0,
  })
  if (model.edges !== undefined) {
    const out = (k: number) => model.edges.filter(([from]: number[]) => from === k).length
    const moves = model.edges.map(([from, to]: number[]): Move => [from, to, fraction(1, out(from))])
    const { structure } = solveTable('discrete', model.states, moves)
    return [
      fact(
        'closed classes',
        JSON.parse(values.closedClasses),
        structure.closedClasses.map(({ states }) => [...states]),
      ),
      fact(
        'periods',
        JSON.parse(values.periods),
        structure.closedClasses.map(({ period }) => period),
      ),
      fact('transient states', JSON.parse(values.transientStates), [...structure.transientStates]),
    ]
  }
  if (id.startsWith('ruin')) {
    const p = number(model.p)
    const inner = range(model.N).slice(1)
    const moves: Move[] = [
      [0, 0, one],
      [model.N, model.N, one],
      ...inner.flatMap((k): Move[] => [
        [k, k + 1, p],
        [k, k - 1, subtract(one, p)],
      ]),
    ]
    const { structure } = solveTable('discrete', model.N + 1, moves, { start: model.start })
    const won = structure.closedClasses[1]
    return [
      {
        what: 'probability of winning',
        expected: values.probWin,
        computed: won.reachedWith,
        errorBound: won.reachedWithError,
      },
      { what: 'duration', expected: values.expectedDuration, computed: structure.meanTimeToSettle },
    ]
  }
  if (id.startsWith('ehrenfest')) {
    const d: number = model.balls
    const moves = birthDeath(
      d,
      (k) => fraction(d - k, d),
      (k) => fraction(k, d),
    )
    return [{ what: 'mean passage', expected: values.meanPassage, computed: passage('discrete', d + 1, moves, 0, [d]) }]
  }
  if (id.startsWith('coupon')) {
    const n = 10
    const moves = withStay(
      n + 1,
      range(n).map((k): Move => [k, k + 1, fraction(n - k, n)]),
    )
    return [
      {
        what: 'mean',
        expected: values.mean,
        computed: solveTable('discrete', n + 1, moves).structure.meanTimeToSettle,
      },
    ]
  }
  const moves = movesOfMatrix(model.matrix)
  return model.transient.flatMap((start: number, row: number): Check[] => {
    const { structure } = solveTable('discrete', model.matrix.length, moves, { start })
    return [
      { what: `mean steps from ${start}`, expected: values.meanSteps[row], computed: structure.meanTimeToSettle },
      ...structure.closedClasses.map(({ reachedWith, reachedWithError }, k) => ({
        what: `absorption from ${start} in class ${k}`,
        expected: values[`absorb_from_${start}`][k],
        computed: reachedWith,
        errorBound: reachedWithError,
      })),
    ]
  })
}

function decomposable({ model, values }: Reference): Check[] {
  const size = values.pi.length
  const moves: Move[] =
    model.type === 'dtmc'
      ? movesOfMatrix(model.matrix)
      : model.rates.map(([from, to, rate]: [number, number, string]): Move => [from, to, number(rate)])
  const time = model.type === 'dtmc' ? 'discrete' : 'continuous'
  const blocks = (model.blocks ?? []).map(
    (states: number[], k: number) => [`block ${k}`, values.blockProbabilities[k], only(size, ...states)] as const,
  )
  return [...shares(time, size, moves, values.pi), ...means(time, size, moves, blocks)]
}

function lossSystem(servers: number, load: Fraction): Move[] {
  return birthDeath(
    servers,
    () => load,
    (k) => fraction(k),
  )
}

function erlang({ id, model, values }: Reference): Check[] {
  const { servers } = model
  const size = servers + 1
  const blocked = (load: string) =>
    means('continuous', size, lossSystem(servers, number(load)), [['blocking', '0', only(size, servers)]])[0]
  if (id.startsWith('erlang-b-inverse')) return [{ ...blocked(values.offered), expected: model.blocking }]
  if (id.startsWith('erlang-b-printed')) {
    // The printed load is the true one to half a unit: the blocking at either end of that interval lies about the given.
    return model.blocking.flatMap((wanted: string): Check[] => {
      const load = Number(values[`offered_at_${wanted}`])
      const below = blocked(String((load * 100 - 5) / 100)).computed
      const above = blocked(String((load * 100 + 5) / 100)).computed
      const inside = below <= Number(wanted) && Number(wanted) <= above
      return [{ what: `load ${load} for ${wanted}`, expected: '1', computed: inside ? 1 : 0, within: 0 }]
    })
  }
  const load = divide(number(model.arrivalRate), number(model.serviceRate))
  return means('continuous', size, lossSystem(servers, load), [
    ['blocking', values.blocking, only(size, servers)],
    ['mean busy', values.meanBusy, counts(size)],
  ])
}

function station({ model, values }: Reference): Check[] {
  if (model.type === 'M/M/c/K') {
    const { servers, capacity } = model
    const arrival = number(model.arrivalRate)
    const moves = birthDeath(
      capacity,
      () => arrival,
      (k) => times(number(model.serviceRate), Math.min(k, servers)),
    )
    const size = capacity + 1
    return [
      ...shares('continuous', size, moves, values.pi),
      ...means('continuous', size, moves, [
        ['blocking', values.blocking, only(size, capacity)],
        ['L', values.L, counts(size)],
        ['Lq', values.Lq, counts(size).map((k) => Math.max(0, k - servers))],
        [
          'busy servers, times the service rate',
          values.throughput,
          counts(size).map((k) => Math.min(k, servers) * Number(model.serviceRate)),
        ],
      ]),
    ]
  }
  const { machines, spares, repairers } = model
  const all = machines + spares
  const size = all + 1
  const moves = birthDeath(
    all,
    (k) => times(number(model.failureRate), Math.min(machines, all - k)),
    (k) => times(number(model.repairRate), Math.min(k, repairers)),
  )
  return [
    ...shares('continuous', size, moves, values.pi),
    ...means('continuous', size, moves, [
      ['mean failed', values.meanFailed, counts(size)],
      ['mean running', values.meanRunning, counts(size).map((k) => Math.min(machines, all - k))],
      ['busy repairers', values.meanBusyRepairers, counts(size).map((k) => Math.min(k, repairers))],
      ['all running', values.probAllRunning, counts(size).map((k) => (k <= spares ? 1 : 0))],
    ]),
  ]
}

function stock({ id, model, values }: Reference): Check[] {
  if (id.startsWith('sS-continuous')) {
    const { s, S } = model
    const size = S + 1
    const demand = number(model.demandRate)
    const moves: Move[] = range(size).flatMap((k): Move[] => [
      ...(k > 0 ? [[k, k - 1, demand] as Move] : []),
      ...(k <= s ? [[k, k + S - s, number(model.leadTimeRate)] as Move] : []),
    ])
    const orders = counts(size).map((k) => (k === s + 1 ? Number(model.demandRate) : 0))
    return [
      ...shares('continuous', size, moves, values.pi),
      ...means('continuous', size, moves, [
        ['mean stock', values.meanStock, counts(size)],
        ['fraction lost', values.fractionLost, only(size, 0)],
        ['order rate', values.orderRate, orders],
      ]),
    ]
  }
  if (id.startsWith('sS-periodic')) {
    const { s, S } = model
    const size = S + 1
    // Poisson(1): e⁻¹/k!, the last one the rest, so that a row sums to 1; e⁻¹ to 34 digits.
    const base = number('0.3678794411714423215955237701614609')
    const factorial = (k: number): number => (k < 2 ? 1 : k * factorial(k - 1))
    const moves = range(size).flatMap((k): Move[] => {
      const level = k <= s ? S : k
      const exactDemand = range(level).map((d) => divide(base, fraction(factorial(d))))
      const rest = exactDemand.reduce((left, p) => subtract(left, p), one)
      return [...exactDemand.map((p, d): Move => [k, level - d, p]), [k, 0, rest]]
    })
    return [
      ...shares('discrete', size, moves, values.pi),
      ...means('discrete', size, moves, [
        ['order frequency', values.orderFrequency, only(size, ...range(s + 1))],
        ['mean stock', values.meanStock, counts(size)],
      ]),
    ]
  }
  if (id.startsWith('on-off')) {
    const moves: Move[] = [
      [0, 1, number(model.failureRate)],
      [1, 0, number(model.repairRate)],
    ]
    return means('continuous', 2, moves, [
      ['availability', values.availability, [1, 0]],
      ['failure frequency', values.failureFrequency, [Number(model.failureRate), 0]],
    ])
  }
  const { k: needed, n, repairers } = model
  const failure = number(model.failureRate)
  const size = n + 1
  const moves = birthDeath(
    n,
    (f) => times(failure, n - f),
    (f) => times(number(model.repairRate), Math.min(f, repairers)),
  )
  const firstDown = n - needed + 1
  const up = counts(size).map((f) => (f < firstDown ? 1 : 0))
  const [availability, frequency, ...others] = means('continuous', size, moves, [
    ['availability', values.availability, up],
    [
      'failure frequency',
      values.failureFrequency,
      counts(size).map((f) => (f === firstDown - 1 ? Number(model.failureRate) * needed : 0)),
    ],
    ['unavailability', values.unavailability, up.map((each) => 1 - each)],
  ])
  const down = range(size).slice(firstDown)
  return [
    ...shares('continuous', size, moves, values.pi),
    availability,
    frequency,
    ...others,
    { what: 'time to failure', expected: values.mttf, computed: passage('continuous', size, moves, 0, down) },
    { what: 'mean down time', expected: values.meanDownTime, computed: others[0].computed / frequency.computed },
    { what: 'mean up time', expected: values.meanUpTime, computed: availability.computed / frequency.computed },
  ]
}

function closedNetwork({ model, values }: Reference): Check[] {
  const { customers } = model
  const servers: number[] = model['servers (0 = delay station)']
  const visits: Fraction[] = model.visitRatios.map(number)
  const allVisits = visits.reduce((sum, each) => add(sum, each))
  const states: number[][] = range(customers + 1).flatMap((a) =>
    range(customers + 1 - a).map((b) => [a, b, customers - a - b]),
  )
  const indexOf = new Map(states.map((state, k) => [state.join(), k]))
  const busy = (station: number, present: number) =>
    servers[station] === 0 ? present : Math.min(present, servers[station])
  const moves = states.flatMap((state, from) =>
    [0, 1, 2].flatMap((station): Move[] => {
      if (state[station] === 0) return []
      const rate = divide(fraction(busy(station, state[station])), number(model.meanServiceTimes[station]))
      return [0, 1, 2].map((next): Move => {
        const after = state.slice()
        after[station]--
        after[next]++
        return [from, indexOf.get(after.join()) as number, multiply(rate, divide(visits[next], allVisits))]
      })
    }),
  )
  const size = states.length
  const perUnit = 1 / Number(model.meanServiceTimes[0]) / Number(model.visitRatios[0])
  return means('continuous', size, moves, [
    ...[0, 1, 2].map(
      (k) => [`number at station ${k}`, values.meanNumbers[k], states.map((state) => state[k])] as const,
    ),
    ...[0, 1, 2].map(
      (k) =>
        [
          `utilisation ${k}`,
          values.utilisations[k],
          states.map((state) => busy(k, state[k]) / Math.max(1, servers[k])),
        ] as const,
    ),
    ...values.marginalStation1.map(
      (share: string, count: number) =>
        [`${count} at station 1`, share, states.map((state) => (state[0] === count ? 1 : 0))] as const,
    ),
    ['throughput', values.throughput, states.map((state) => busy(0, state[0]) * perUnit)],
  ])
}

function kemeny({ model, values }: Reference): Check[] {
  const moves = movesOfMatrix(model.matrix)
  const size = model.matrix.length
  const { answer } = solveTable('discrete', size, moves)
  const from = 0
  const constant = range(size).reduce(
    (sum, j) => (j === from ? sum : sum + (answer.shares?.[j] as number) * passage('discrete', size, moves, from, [j])),
    0,
  )
  return [{ what: 'Σ π_j m_ij without returns', expected: values.withReturnTimesZero, computed: constant }]
}

function twoStates({ model, values }: Reference): Check[] {
  const discrete = model.type === 'dtmc'
  const moves: Move[] = [
    [0, 1, number(model.p01 ?? model.q01)],
    [1, 0, number(model.p10 ?? model.q10)],
  ]
  return means(discrete ? 'discrete' : 'continuous', 2, discrete ? withStay(2, moves) : moves, [
    ['mean', values.mean, [0, 1]],
  ])
}

const builders: readonly (readonly [file: string, ids: RegExp, checks: (reference: Reference) => Check[]])[] = [
  ['classic-chains', /./, classic],
  ['structure', /./, structureCase],
  ['nearly-decomposable-and-stiff', /./, decomposable],
  ['erlang', /^erlang-b/, erlang],
  ['single-station', /^(mmck|repair)/, station],
  ['inventory-and-reliability', /./, stock],
  ['networks', /^(central-server|interactive|closed-multi)/, closedNetwork],
  ['dynamics', /^kemeny/, kemeny],
  ['variance-constants', /^(two-state|on-off)/, twoStates],
]

export const finiteCases: readonly FiniteCase[] = builders.flatMap(([file, ids, checks]) =>
  referencesOf(file)
    .filter(({ id }) => ids.test(id))
    .map((reference) => ({ id: reference.id, source: reference.source, checks: () => checks(reference) })),
)

/** Relative error, worked out in exact fractions: the printed value has more digits than a double. */
export function relativeError({ expected, computed }: Check): number {
  const wanted = number(expected)
  const off = subtract(number(String(computed)), wanted)
  const magnitude = (a: Fraction) => Math.abs(Number((a.numerator * 10n ** 40n) / a.denominator)) / 1e40
  return wanted.numerator === 0n ? magnitude(off) : magnitude(divide(off, wanted))
}
