import { describe, expect, test } from 'vitest'
import { toText } from '../../src/numbers/fraction.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { modelOf } from './model-of.js'

const plain = { withoutRemedies: true }

describe('open networks (Jackson 1957, 1963)', () => {
  // Feedback: station 1 gets a + half of what it serves, so its throughput is 2a; station 2 gets half of that, a.
  const feedback = (a: string) =>
    modelOf(`
      state: { bench: { from: 0, start: 0 }, oven: { from: 0, start: 0 } }
      transitions:
        come: { rate: ${a}, then: { bench: bench + 1 } }
        again: { when: bench > 0, rate: 1/2, then: {} }
        on: { when: bench > 0, rate: 1/2, then: { bench: bench - 1, oven: oven + 1 } }
        back: { when: oven > 0, rate: 1, then: { oven: oven - 1, bench: bench + 1 } }
        done: { when: oven > 0, rate: 1, then: { oven: oven - 1 } }
    `)
  // bench: throughput of moves a + oven/2, oven: the same as bench leaves; so bench moves 2a against 1/2.
  test.each([
    ['0.249', 'positive recurrent', 'proved'],
    ['1/4', 'null recurrent', 'indicated'],
    ['0.251', 'transient', 'proved'],
  ])('a bench with rework, arrivals at %s: %s', (a, recurrence, grade) => {
    expect(classifyCountable(feedback(a), plain)).toMatchObject({ recurrence, grade })
  })

  const line = (rates: readonly string[], arrivals: string) =>
    modelOf(`
      constants: { rate: [${rates.join(', ')}] }
      state: { queue: { index: { from: 1, to: ${rates.length} }, from: 0, start: 0 } }
      transitions:
        come: { rate: ${arrivals}, then: { "queue[1]": "queue[1] + 1" } }
        pass:
          each: { i: { from: 1, to: ${rates.length - 1} } }
          when: queue[i] > 0
          rate: rate[i]
          then: { "queue[i]": "queue[i] - 1", "queue[i + 1]": "queue[i + 1] + 1" }
        leave: { when: "queue[${rates.length}] > 0", rate: "rate[${rates.length}]", then: { "queue[${rates.length}]": "queue[${rates.length}] - 1" } }
    `)
  test.each([
    [['3', '2', '4', '5'], '1.99', 'positive recurrent', 'proved'],
    [['3', '2', '4', '5'], '2', 'null recurrent', 'indicated'],
    [['3', '2', '4', '5'], '2.01', 'transient', 'proved'],
    [['3', '2', '2', '5'], '2', 'undetermined', 'open'],
    [['2', '2', '2', '2', '2', '2', '2', '2'], '1.9', 'positive recurrent', 'proved'],
  ] as const)('a line of stations with rates %j and arrivals at %s: %s', (rates, arrivals, recurrence, grade) => {
    expect(classifyCountable(line(rates, arrivals), plain)).toMatchObject({ recurrence, grade })
  })

  test('where the class is not told, that there is no steady state still is', () => {
    expect(classifyCountable(line(['3', '2', '2', '5'], '2'), plain).noSteadyState).toBe(true)
  })

  // With input 5 the first station passes on 3, the second 2, the third all of it (Goodman and Massey 1984).
  test('bottlenecks hold back what comes after them', () => {
    const { growth } = classifyCountable(line(['3', '2', '4', '3'], '5'), plain)
    expect(growth?.map(({ name, exact }) => `${name} ${exact && toText(exact)}`)).toEqual([
      'speed_queue[1] 2',
      'speed_queue[2] 1',
      'speed_queue[3] 0',
      'speed_queue[4] 0',
    ])
  })

  test('stations with many servers or impatience are judged by their rate at large counts', () => {
    const model = (servers: string) =>
      modelOf(`
      state: { a: { from: 0, start: 0 }, b: { from: 0, start: 0 } }
      transitions:
        come: { rate: 10, then: { a: a + 1 } }
        pass: { rate: "min(a, ${servers})", then: { a: a - 1, b: b + 1 } }
        leave: { rate: "min(b, 3) + b/10", then: { b: b - 1 } }
    `)
    expect(classifyCountable(model('11'), plain)).toMatchObject({ recurrence: 'positive recurrent', grade: 'proved' })
    expect(classifyCountable(model('9'), plain)).toMatchObject({ recurrence: 'transient', grade: 'proved' })
  })

  test('a station whose rate looks at another is no such network', () => {
    const model = modelOf(`
      state: { a: { from: 0, start: 0 }, b: { from: 0, start: 0 }, c: { from: 0, start: 0 } }
      transitions:
        come: { rate: 1, then: { a: a + 1 } }
        pass: { when: a > 0, rate: "if(b > 3, 1/2, 2)", then: { a: a - 1, b: b + 1 } }
        on: { when: b > 0, rate: 3, then: { b: b - 1, c: c + 1 } }
        leave: { when: c > 0, rate: 3, then: { c: c - 1 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({ recurrence: 'undetermined', grade: 'open' })
  })
})

describe('quarter plane (Fayolle, Malyshev and Menshikov 1995, 3.3)', () => {
  // Two lines; while one is empty its server helps the other: speeds 1 together, `helped` alone.
  const helping = (a: string, b: string, helped: string) =>
    modelOf(`
      state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 } }
      transitions:
        come_x: { rate: ${a}, then: { x: x + 1 } }
        come_y: { rate: ${b}, then: { y: y + 1 } }
        go_x: { when: x > 0, rate: "if(y > 0, 1, ${helped})", then: { x: x - 1 } }
        go_y: { when: y > 0, rate: "if(x > 0, 1, ${helped})", then: { y: y - 1 } }
    `)
  // y alone is busy a share b of the time, so x gets b·1 + (1 - b)·helped: with b = 1/2 and helped = 2 this is 3/2.
  test.each([
    ['0.9', '0.9', '2', 'positive recurrent', 'proved'],
    ['1.49', '1/2', '2', 'positive recurrent', 'proved'],
    ['3/2', '1/2', '2', 'null recurrent', 'indicated'],
    ['1.51', '1/2', '2', 'transient', 'proved'],
    ['1/2', '1.51', '2', 'transient', 'proved'],
    ['1', '1/2', '2', 'positive recurrent', 'proved'], // drift inside (0, -1/2)
    ['1.01', '1.01', '5', 'transient', 'proved'],
    ['1', '1.01', '5', 'transient', 'proved'],
    ['1', '1', '5', 'undetermined', 'open'], // drift inside exactly 0
    ['0.99', '1/2', '1/2', 'transient', 'proved'], // y empty half of the time: x gets 3/4
  ])('arrivals at %s and %s, %s alone: %s', (a, b, helped, recurrence, grade) => {
    expect(classifyCountable(helping(a, b, helped), plain)).toMatchObject({ recurrence, grade })
  })

  test('the speed along an axis is the mean over the other line', () => {
    expect(classifyCountable(helping('2', '1/2', '2'), plain).growth).toMatchObject([
      { name: 'speed_x', value: 0.5 },
      { name: 'speed_y', value: 0 },
    ])
  })

  test('discrete time: steps with a rest that stays', () => {
    const model = modelOf(`
      time: discrete
      remainder: stay
      state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 } }
      transitions:
        come: { probability: 0.2, then: { x: x + 1 } }
        pass: { when: x > 0, probability: 0.3, then: { x: x - 1, y: y + 1 } }
        go: { when: y > 0, probability: 0.25, then: { y: y - 1 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject({
      recurrence: 'positive recurrent',
      grade: 'proved',
      closedClasses: [{ size: null, period: 1 }],
    })
  })
})

describe('two counts with wide strips or phases (Foster 1953 with a quadratic function)', () => {
  // Two clerks; urgent cases go before others. The work that comes is (a + b)/2 of what both can do.
  const urgent = (a: string, b: string) =>
    modelOf(`
    state: { urgent: { from: 0, start: 0 }, other: { from: 0, start: 0 } }
    transitions:
      come_urgent: { rate: ${a}, then: { urgent: urgent + 1 } }
      come_other: { rate: ${b}, then: { other: other + 1 } }
      go_urgent: { rate: "min(urgent, 2)", then: { urgent: urgent - 1 } }
      go_other: { rate: "min(other, 2 - min(urgent, 2))", then: { other: other - 1 } }
  `)
  test('two clerks with priorities: proved where each line of states leads back', () => {
    expect(classifyCountable(urgent('1/4', '1/2'), plain)).toMatchObject({
      recurrence: 'positive recurrent',
      grade: 'proved',
      theorem: 'Foster 1953',
    })
  })

  test.each([
    ['1', '1'], // exactly balanced
    ['1', '3/2'],
    ['5/2', '1/4'],
  ])('with more work than they can do, at %s and %s, nothing is proved', (a, b) => {
    expect(classifyCountable(urgent(a, b), plain).grade).toBe('open')
  })

  // A gate that is shut now and then stops both lines at once: in each phase alone nothing leads back while it is shut.
  test('a phase in which both lines grow is beyond it', () => {
    const model = modelOf(`
      state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 }, shut: { from: 0, to: 1, start: 0 } }
      transitions:
        come_x: { rate: 1/10, then: { x: x + 1 } }
        come_y: { rate: 1/10, then: { y: y + 1 } }
        go_x: { when: x > 0 and shut == 0, rate: 1, then: { x: x - 1 } }
        go_y: { when: y > 0 and shut == 0, rate: 1, then: { y: y - 1 } }
        turn: { rate: 1, then: { shut: 1 - shut } }
    `)
    expect(classifyCountable(model, plain).grade).toBe('open')
  })
})

describe('walks in several dimensions (Pólya 1921; Chung and Fuchs 1951)', () => {
  const walk = (jumps: readonly (readonly number[])[], time = 'continuous') => {
    const d = jumps[0].length
    const names = ['x', 'y', 'z', 'w'].slice(0, d)
    return modelOf(
      [
        `time: ${time}`,
        `state: { ${names.map((name) => `${name}: { start: 0 }`).join(', ')} }`,
        'transitions:',
        ...jumps.map((jump, k) => {
          const then = names.map((name, i) => `${name}: ${name} + ${jump[i]}`).join(', ')
          return `  t${k}: { ${time === 'discrete' ? `probability: 1/${jumps.length}` : 'rate: 1'}, then: { ${then} } }`
        }),
      ].join('\n'),
    )
  }
  test.each([
    [
      [
        [1, 0],
        [0, 1],
        [-1, -1],
      ],
      'null recurrent',
    ],
    [
      [
        [2, 1],
        [-1, 1],
        [-1, -2],
      ],
      'null recurrent',
    ],
    [
      [
        [1, 0],
        [0, 1],
        [-1, 0],
      ],
      'transient',
    ],
    [
      [
        [1, 0, 0],
        [0, 1, 0],
        [0, 0, 1],
        [-1, -1, -1],
      ],
      'transient',
    ],
    [
      [
        [1, 0, 1],
        [0, 1, 1],
        [-1, -1, -2],
      ],
      'null recurrent',
    ], // three coordinates, but it lives on a plane
    [
      [
        [1, 2, 3],
        [-1, -2, -3],
      ],
      'null recurrent',
    ], // on a line
  ] as const)('jumps %j: %s', (jumps, recurrence) => {
    // biome-ignore format: one call
    expect(classifyCountable(walk(jumps), plain)).toMatchObject({ recurrence, grade: 'proved' })
  })

  test.each([
    [
      [
        [1, 0],
        [-1, 0],
        [0, 1],
        [0, -1],
      ],
      2,
    ],
    [
      [
        [1, 0],
        [0, 1],
        [-1, -1],
      ],
      3,
    ],
    [
      [
        [1, 0],
        [-1, 0],
        [0, 1],
        [0, -1],
        [1, 1],
        [-1, -1],
      ],
      1,
    ],
  ] as const)('jumps %j in discrete time: period %d', (jumps, period) => {
    expect(classifyCountable(walk(jumps, 'discrete'), plain).closedClasses).toEqual([{ size: null, period }])
  })

  test('a walk that is held up in one place is another model, and stays open', () => {
    const model = modelOf(`
      state: { x: { start: 0 }, y: { start: 0 }, z: { start: 0 } }
      transitions:
        x_up: { rate: "if(x == 0, 1/2, 1)", then: { x: x + 1 } }
        x_down: { rate: 1, then: { x: x - 1 } }
        y_up: { rate: 1, then: { y: y + 1 } }
        y_down: { rate: 1, then: { y: y - 1 } }
        z_up: { rate: 1, then: { z: z + 1 } }
        z_down: { rate: 1, then: { z: z - 1 } }
    `)
    expect(classifyCountable(model, plain).grade).toBe('open')
  })
})

describe('counters beside a chain', () => {
  test.each(['1/2', '1', '3/2'])('work done is counted, arrivals at %s: transient', (a) => {
    const model = modelOf(`
      state: { n: { from: 0, start: 0 }, done: { from: 0, start: 0 } }
      transitions:
        come: { rate: ${a}, then: { n: n + 1 } }
        go: { when: n > 0, rate: 1, then: { n: n - 1, done: done + 1 } }
    `)
    expect(classifyCountable(model, plain)).toMatchObject(
      a === '1' ? { grade: 'open' } : { recurrence: 'transient', grade: 'proved', closedClasses: [] },
    )
  })

  test('a difference that rises and falls is no counter', () => {
    const model = modelOf(`
      state: { n: { from: 0, start: 0 }, lead: { start: 0 } }
      transitions:
        come: { rate: 1/2, then: { n: n + 1, lead: lead + 1 } }
        go: { when: n > 0, rate: 1, then: { n: n - 1, lead: lead - 1 } }
    `)
    expect(classifyCountable(model, plain).recurrence).not.toBe('transient')
  })
})
