import { describe, expect, test } from 'vitest'
import { toText } from '../../src/numbers/fraction.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { birthDeath, birthDeathSteps, modelOf } from './model-of.js'

const plain = { withoutRemedies: true }

/** Short names of the classes, so that the tables below can be read. */
const classes = {
  positive: 'positive recurrent',
  null: 'null recurrent',
  transient: 'transient',
  mixed: 'mixed',
} as const

// By the series of Karlin and McGregor 1957 (from memory), worked out by hand: with λ(n)/μ(n+1) → r the class is
// positive for r < 1, transient for r > 1; with 1 + a/n + …: positive for a < -1; and Σ 1/(λπ) decides transience.
describe.each([
  // λ, μ, class
  ['0.999', '1', 'positive'],
  ['1', '1', 'null'],
  ['1.001', '1', 'transient'],
  ['2.99', 'min(n, 3)', 'positive'],
  ['3', 'min(n, 3)', 'null'],
  ['3.01', 'min(n, 3)', 'transient'],
  ['1000', 'n', 'positive'],
  ['1/(n + 1)', '1', 'positive'],
  ['n + 1', '1', 'transient'],
  ['n + 1', 'n^2', 'positive'],
  ['n + 1/2', 'n', 'null'],
  ['n + 1', 'n', 'null'], // a = 0, Σ 1/n diverges
  ['n + 1.001', 'n', 'transient'],
  ['0.999*n + 3', 'n', 'positive'],
  ['1.001*n + 1', 'n', 'transient'],
  // λ(n) = n² + 1, μ(n) = n² + bn: λ(n)/μ(n+1) = 1 - (2 + b)/n: weights n^(-2-b), Σ 1/(n² n^(-2-b)) = Σ n^b.
  ['n^2 + 1', 'n^2', 'positive'],
  ['n^2 + 1', 'n^2 - n + 1', 'null'], // weights 1/n: infinite in sum; Σ 1/n diverges
  ['n^2 + n + 1', 'n^2', 'null'], // the other way round: the same
  ['n^2 + 1.001*n + 1', 'n^2', 'transient'],
  ['n^2 + 0.999*n + 1', 'n^2', 'positive'], // a = -1.001
  // Drift -c/n at variance 2: weights n^(-c): the steady state begins beyond 1.
  ['1', '1 + 1/n', 'null'],
  ['1', '1 + 1.001/n', 'positive'],
  ['1 + 1/(n + 1)', '1', 'null'], // weights n, Σ 1/n diverges: just recurrent
  ['1 + 1.001/(n + 1)', '1', 'transient'],
  ['1', '1 + 100/n^2', 'null'], // smaller than 1/n: as without
  ['if(n < 1000, 5, 0.9)', '1', 'positive'],
  ['if(n < 50, 0.1, 1.1)', '1', 'transient'],
  ['max(5 - n, 1)', 'if(n > 7, 1, 9)', 'null'],
] as const)('births %s, deaths %s', (birth, death, expected) => {
  test(`${classes[expected]}`, () => {
    const { recurrence, grade, theorem, closedClasses } = classifyCountable(birthDeath(birth, death), plain)
    expect({ recurrence, grade }).toEqual({ recurrence: classes[expected], grade: 'proved' })
    expect(theorem).toMatch(/Karlin and McGregor 1957|Neuts 1981/)
    expect(closedClasses).toEqual([{ size: null, period: 1 }])
  })
})

// Drift c/n in steps of one at variance 1 (Lamperti 1960, 1963, from memory): transient for 2c > 1, positive for 2c < -1.
test.each([
  [-0.501, 'positive'],
  [-0.5, 'null'],
  [-0.499, 'null'],
  [0, 'null'],
  [0.5, 'null'],
  [0.501, 'transient'],
  [1, 'transient'],
] as const)('steps up with (1 + %d/(n + 2))/2: the class is %s, the period 2', (c, expected) => {
  const model = birthDeathSteps('(1 + c/(n + 2))/2', '(1 - c/(n + 2))/2', `{ c: ${c} }`)
  const found = classifyCountable(model, plain)
  expect([found.recurrence, found.grade]).toEqual([classes[expected], 'proved'])
  expect(found.closedClasses).toEqual([{ size: null, period: 2 }])
})

test('a step that may stay makes the period 1', () => {
  expect(classifyCountable(birthDeathSteps('1/4', '1/4'), plain)).toMatchObject({
    recurrence: 'null recurrent',
    closedClasses: [{ size: null, period: 1 }],
  })
})

// Reuter 1957 (from memory): Σ (1/λπ) Σ π; pure birth: Σ 1/λ (Feller 1968, XVII.4).
test.each([
  ['n + 1', '0', false],
  ['(n + 1)^2', '0', true],
  ['(n + 1)^1', 'n/2', false],
  ['2*(n + 1)^2', 'n^2', true],
  ['n^2 + 2*n + 1', 'n^2', false], // weights 1: transient, n/n² diverges
  ['n^3 + 3*n^2 + 1', 'n^3', true], // weights constant, n/n³ converges
])('births %s, deaths %s: transient, explosive %s', (birth, death, explosive) => {
  const found = classifyCountable(birthDeath(birth, death), plain)
  expect([found.recurrence, found.grade, found.explosive ?? false]).toEqual(['transient', 'proved', explosive])
})

test('rates that grow fast but lead back do not explode', () => {
  expect(classifyCountable(birthDeath('(n + 1)^2', '2*n^2'), plain)).toMatchObject({ recurrence: 'positive recurrent' })
  expect(classifyCountable(birthDeath('(n + 1)^2', '2*n^2'), plain).explosive).toBeUndefined()
})

const absorbing = (birth: string, death: string) => classifyCountable(birthDeath(birth, death, '{}', 3), plain)
// Linear branching (Athreya and Ney 1972, from memory): dies out with certainty up to balance, else with probability below 1.
test.each([
  ['0.9*n', 'n', 'positive'],
  ['n', 'n', 'positive'],
  ['1.1*n', 'n', 'mixed'],
] as const)('a population with births %s and deaths %s: %s', (birth, death, expected) => {
  expect(absorbing(birth, death)).toMatchObject({
    recurrence: classes[expected],
    grade: 'proved',
    closedClasses: [{ size: 1, period: 1 }],
  })
})

test.each([
  [1, 2, 'positive'],
  [1, 1, 'positive'],
  [2, 1, 'mixed'],
] as const)('a game won at rate %d and lost at rate %d until ruin: %s', (won, lost, expected) => {
  const model = modelOf(`
    state: { purse: { from: 0, start: 5 } }
    transitions:
      win: { when: purse > 0, rate: ${won}, then: { purse: purse + 1 } }
      lose: { when: purse > 0, rate: ${lost}, then: { purse: purse - 1 } }
  `)
  expect(classifyCountable(model, plain)).toMatchObject({ recurrence: classes[expected], grade: 'proved' })
})

describe('jumps of any size and phases', () => {
  const bulk = (rate: string, size: number, take: number) =>
    modelOf(`
      state: { n: { from: 0, start: 0 } }
      transitions:
        come: { rate: ${rate}, then: { n: n + ${size} } }
        go: { when: n > 0, rate: 1, then: { n: "max(n - ${take}, 0)" } }
    `)
  test.each([
    ['0.333', 3, 1, 'positive'],
    ['1/3', 3, 1, 'null'],
    ['0.334', 3, 1, 'transient'],
    ['1.33', 3, 4, 'positive'],
    ['4/3', 3, 4, 'null'],
    ['1.34', 3, 4, 'transient'],
    ['0.99', 6, 6, 'positive'],
    ['1', 6, 6, 'null'],
  ] as const)('batches at rate %s of %d, up to %d served at a time: %s', (rate, size, take, expected) => {
    expect(classifyCountable(bulk(rate, size, take), plain)).toMatchObject({
      recurrence: classes[expected],
      grade: 'proved',
    })
  })

  // Repairs: the machine is up a share (1/3)/(1/3 + 1/6) = 2/3 of the time.
  const breakdowns = (rate: string) =>
    modelOf(`
      state: { n: { from: 0, start: 0 }, up: { from: 0, to: 1, start: 1 } }
      transitions:
        come: { rate: ${rate}, then: { n: n + 1 } }
        go: { when: n > 0 and up == 1, rate: 1, then: { n: n - 1 } }
        fail: { when: up == 1, rate: 1/6, then: { up: 0 } }
        mend: { when: up == 0, rate: 1/3, then: { up: 1 } }
    `)
  test.each([
    ['0.666', 'positive'],
    ['2/3', 'null'],
    ['0.667', 'transient'],
  ] as const)('a machine that is up two thirds of the time, with arrivals at %s: %s', (rate, expected) => {
    expect(classifyCountable(breakdowns(rate), plain)).toMatchObject({
      recurrence: classes[expected],
      grade: 'proved',
      theorem: 'Neuts 1981',
    })
  })

  test('the drift and the speed are exact fractions', () => {
    const { drift, growth } = classifyCountable(breakdowns('5/7'), plain)
    expect(drift?.map(({ exact }) => exact && toText(exact))).toEqual(['1/21'])
    expect(growth?.map(({ name, exact }) => [name, exact && toText(exact)])).toEqual([['speed_n', '1/21']])
  })

  // At balance: σ² = λ + μ·2/3 + 2(2/3)(1/3)/(1/2) with on-off switching rate 1/2 (renewal reward; by hand):
  // 2/3 + 2/3 + 8/9 = 20/9, and √(2σ²/π).
  test('growth at balance counts the variance of the phases', () => {
    const { growth } = classifyCountable(breakdowns('2/3'), plain)
    expect(growth?.[0].name).toBe('growth_n')
    expect(growth?.[0].value).toBeCloseTo(Math.sqrt((2 * 20) / 9 / Math.PI), 12)
  })

  test('rates that depend on the remainder of the count are followed', () => {
    // Up at 3 in every third state, else at 1; down at 1 in all. By the cycle condition the ratio over three steps is 3.
    const model = (down: string) => birthDeath('if(n % 3 == 0, 3, 1)', down)
    expect(classifyCountable(model('1'), plain)).toMatchObject({ recurrence: 'transient', grade: 'proved' })
    expect(classifyCountable(model('if(n % 3 == 1, 3, 1)'), plain)).toMatchObject({
      recurrence: 'null recurrent',
      grade: 'proved',
    })
    expect(classifyCountable(model('if(n % 3 == 2, 3.1, 1)'), plain)).toMatchObject({
      recurrence: 'positive recurrent',
      grade: 'proved',
    })
  })

  // Far out: 2 - 1/(n + 1) is rounded down to 1, 1 + 1/(n + 1) up to 2, half a count by turns.
  test.each([
    ['floor(2 - 1/(n + 1))', '1', 'null'],
    ['floor(2 + 1/(n + 1))', '1', 'transient'],
    ['ceil(1 + 1/(n + 1))', '2', 'null'],
    ['ceil(1 - 1/(n + 2))', '1', 'null'],
    ['1', '1 + floor(n/2) - floor((n - 1)/2)', 'positive'],
    ['1', '2*(floor(n/2) - floor((n - 1)/2)) + (n % 2)/2', 'null'], // 2 and 1/2 by turns
    // With n = 3k + 0, 1, 2: k, k, k + 1 up, k + 1 down: weights k^(-3) by the three ratios.
    ['floor(n/3 + 1/2) + (n == 0)', 'floor(n/3) + 1', 'positive'],
  ] as const)('rounding: births %s, deaths %s: %s', (birth, death, expected) => {
    expect(classifyCountable(birthDeath(birth, death), plain)).toMatchObject({ recurrence: classes[expected] })
  })

  test('jumps that leave out every other value are no obstacle', () => {
    const model = (rate: string) =>
      modelOf(`
      state: { n: { from: 0, start: 0 } }
      transitions:
        come: { rate: ${rate}, then: { n: n + 4 } }
        go: { when: n > 0, rate: 1, then: { n: n - 2 } }
    `)
    expect(classifyCountable(model('0.49'), plain).recurrence).toBe('positive recurrent')
    expect(classifyCountable(model('1/2'), plain).recurrence).toBe('null recurrent')
    expect(classifyCountable(model('0.51'), plain).recurrence).toBe('transient')
  })

  // n-proportional service that halts while the machine is down: always comes back (Foster 1953).
  test('many servers that all break down together always catch up', () => {
    const model = modelOf(`
      state: { n: { from: 0, start: 0 }, up: { from: 0, to: 1, start: 1 } }
      transitions:
        come: { rate: 50, then: { n: n + 1 } }
        go: { when: up == 1, rate: n, then: { n: n - 1 } }
        fail: { when: up == 1, rate: 5, then: { up: 0 } }
        mend: { when: up == 0, rate: 1/10, then: { up: 1 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({
      recurrence: 'positive recurrent',
      grade: 'proved',
      theorem: 'Foster 1953',
    })
  })

  // Drift 3/n at variance 2 in two phases that change nothing: growth like a Bessel process of dimension 1 + 3, whose
  // mean is √(2·2) Γ(5/2)/Γ(2) = 2·1.3293403881791370; the same rates times n run on another clock, where no such law holds.
  const bessel = (scale: string) =>
    modelOf(`
    state: { n: { from: 0, start: 0 }, idle: { from: 0, to: 1, start: 0 } }
    transitions:
      up: { rate: "(1 + 3/(n + 1))*${scale}", then: { n: n + 1 } }
      down: { when: n > 0, rate: "${scale}", then: { n: n - 1 } }
      turn: { rate: "${scale}", then: { idle: 1 - idle } }
  `)
  test('growth with phases is told on the clock of the model alone', () => {
    const { growth } = classifyCountable(bessel('1'), plain)
    expect(growth?.[0].name).toBe('growth_n')
    expect(growth?.[0].value).toBeCloseTo(2 * 1.329340388179137, 12)
    expect(classifyCountable(bessel('(n + 1)'), plain)).toMatchObject({ recurrence: 'transient', grade: 'proved' })
    expect(classifyCountable(bessel('(n + 1)'), plain).growth).toBeUndefined()
  })

  // Callers who find the line busy try again later, each on their own: steady if and only if the line alone would be
  // (Falin and Templeton 1997, from memory). While the line is free, retrials grow with the number that wait.
  const retrials = (a: string) =>
    modelOf(`
    state: { busy: { from: 0, to: 1, start: 0 }, waiting: { from: 0, start: 0 } }
    transitions:
      take: { when: busy == 0, rate: ${a}, then: { busy: 1 } }
      put_off: { when: busy == 1, rate: ${a}, then: { waiting: waiting + 1 } }
      retry: { when: busy == 0, rate: waiting/3, then: { busy: 1, waiting: waiting - 1 } }
      done: { when: busy == 1, rate: 1, then: { busy: 0 } }
  `)
  test.each([
    ['0.99', 'positive recurrent', 'proved'],
    ['1.01', 'transient', 'proved'],
  ])('retrials, arrivals at %s against 1: %s', (a, recurrence, grade) => {
    expect(classifyCountable(retrials(a), plain)).toMatchObject({ recurrence, grade })
  })
  test('retrials at exact balance are not claimed to be steady', () => {
    expect(classifyCountable(retrials('1'), plain).recurrence).not.toBe('positive recurrent')
  })

  // Jumps of +2 and -1: drift c/n, variance 2·4/3·… by hand: up 1/3 (+2), down 2/3 (-1): σ² = 4/3 + 2/3 = 2.
  // Down with 2/3 + d/n: drift -3d/n (up loses d: 2·(-d) - d): 2c/σ² = -3d: positive for d > 1/3.
  test.each([
    ['0.334', 'positive'],
    ['1/3', 'null'],
    ['0.333', 'null'],
    ['-0.333', 'null'],
    ['-1/3', 'null'],
    ['-0.334', 'transient'],
  ] as const)('steps of +2 and -1 whose drift vanishes like -3·%s/n: %s', (d, expected) => {
    const model = modelOf(`
      time: discrete
      constants: { d: ${d} }
      state: { n: { from: 0, start: 0 } }
      transitions:
        bounce: { when: n == 0, probability: 1, then: { n: n + 1 } }
        up: { when: n > 0, probability: "1/3 - d/(n + 1)", then: { n: n + 2 } }
        down: { when: n > 0, probability: "2/3 + d/(n + 1)", then: { n: n - 1 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({ recurrence: classes[expected], grade: 'proved' })
  })
})

describe('walks and counters', () => {
  const walk = (up: string, down: string) =>
    modelOf(`
    state: { x: { start: 0 } }
    transitions:
      up: { rate: "${up}", then: { x: x + 1 } }
      down: { rate: "${down}", then: { x: x - 1 } }
  `)
  test.each([
    ['1', '1', 'null'],
    ['1.01', '1', 'transient'],
    ['1', '1.01', 'transient'],
    ['if(x > 0, 1, 2)', 'if(x > 0, 2, 1)', 'positive'],
    ['if(x > 0, 1, 2)', '1', 'null'], // pulled up from below, balanced above
    ['if(x > 0, 2, 1)', '2', 'transient'], // balanced above, drifts down below
    ['if(x > 0, 2, 1)', 'if(x > 0, 1, 2)', 'transient'],
  ] as const)('a walk on the integers, up at %s, down at %s: %s', (up, down, expected) => {
    expect(classifyCountable(walk(up, down), plain)).toMatchObject({ recurrence: classes[expected], grade: 'proved' })
  })

  test('a walk that drifts down has a negative speed', () => {
    expect(classifyCountable(walk('1', '1.5'), plain).growth).toMatchObject([{ name: 'speed_x', value: -0.5 }])
  })

  test('a count without a lower bound is read downwards', () => {
    const model = modelOf(`
      state: { stock: { to: 0, start: 0 } }
      transitions:
        take: { rate: 0.5, then: { stock: stock - 1 } }
        fill: { when: stock < 0, rate: 1, then: { stock: stock + 1 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({ recurrence: 'positive recurrent', grade: 'proved' })
  })

  test('a wear counter with two moods grows at its mean rate and has no closed class', () => {
    const model = modelOf(`
      state: { wear: { from: 0, start: 0 }, hard: { from: 0, to: 1, start: 0 } }
      transitions:
        rub: { rate: "if(hard == 1, 4, 1)", then: { wear: wear + 1 } }
        harden: { when: hard == 0, rate: 1, then: { hard: 1 } }
        ease: { when: hard == 1, rate: 2, then: { hard: 0 } }
    `)
    const found = classifyCountable(model, plain)
    expect(found).toMatchObject({ recurrence: 'transient', grade: 'proved', closedClasses: [] })
    expect(found.growth).toMatchObject([{ name: 'speed_wear', value: 2 }])
  })

  test('a count that is cleared now and then has a steady state', () => {
    const model = modelOf(`
      state: { n: { from: 0, start: 0 } }
      transitions:
        come: { rate: 10, then: { n: n + 1 } }
        clear: { when: n > 0, rate: 1/100, then: { n: 0 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({ recurrence: 'positive recurrent', grade: 'proved' })
  })
})

describe('where the phases fall apart', () => {
  // From `undecided` the model goes for good to line 1 or line 2, each with its own service rate.
  const split = (first: string, second: string) =>
    modelOf(`
    state: { n: { from: 0, start: 0 }, line: { from: 0, to: 2, start: 0 } }
    transitions:
      come: { rate: 1, then: { n: n + 1 } }
      go: { when: n > 0, rate: "if(line == 1, ${first}, if(line == 2, ${second}, 1))", then: { n: n - 1 } }
      choose: { each: { l: { from: 1, to: 2 } }, when: line == 0, rate: 1, then: { line: l } }
  `)
  test.each([
    ['2', '3', 'positive'],
    ['2', '1/2', 'mixed'],
    ['2', '1', 'mixed'],
    ['1', '1', 'null'],
    ['1/2', '1/3', 'transient'],
  ] as const)('lines served at %s and %s: %s', (first, second, expected) => {
    expect(classifyCountable(split(first, second), plain)).toMatchObject({
      recurrence: classes[expected],
      grade: 'proved',
    })
  })

  test('one line balanced, one overloaded: no steady state, and no class is claimed', () => {
    expect(classifyCountable(split('1', '1/2'), plain)).toMatchObject({
      recurrence: 'undetermined',
      grade: 'open',
      noSteadyState: true,
    })
  })
})

describe('what is not followed stays open', () => {
  test.each([
    ['sqrt(n + 1)', 'n'],
    ['2 - 0.5^n', '2'],
    ['2 + exp(-n)', '2'],
    ['if(n % 1009 == 0, 2, 1)', '1.5'],
  ])('births %s, deaths %s', (birth, death) => {
    expect(classifyCountable(birthDeath(birth, death), plain)).toMatchObject({
      recurrence: 'undetermined',
      grade: 'open',
    })
  })

  test('a rate without an exact fraction is judged by its rounded value, and that is no proof', () => {
    expect(classifyCountable(birthDeath('exp(-1)', '1'), plain)).toMatchObject({
      recurrence: 'positive recurrent',
      grade: 'indicated',
    })
  })

  test('binomial batches are fractions: two come on average, two go', () => {
    const model = modelOf(`
      time: discrete
      state: { n: { from: 0, start: 0 } }
      transitions:
        step: { each: { k: { from: 0, to: 4 } }, probability: "binomial(k, 4, 1/2)", then: { n: "max(n - 2, 0) + k" } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({ recurrence: 'null recurrent', grade: 'proved' })
  })

  test('evidence of a pilot run is taken over as indicated, never as proved', () => {
    const evidence = () => ({ recurrence: 'transient' as const, basis: 'the pilot run grows' })
    expect(classifyCountable(birthDeath('sqrt(n + 1)', '1'), { ...plain, evidence })).toMatchObject({
      recurrence: 'transient',
      grade: 'indicated',
    })
  })
})
