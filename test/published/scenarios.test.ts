/**
 * The finite reference cases once more, this time written as a user would write them: a scenario's text, read, compiled,
 * explored and solved. Each test prints the case's own source; tolerance 1e-12 relative throughout, as the cases state.
 */
import { readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { explore } from '../../src/chain/explore.js'
import { joinArcs } from '../../src/chain/joined-arcs.js'
import { structureOf } from '../../src/chain/structure.js'
import { compile } from '../../src/model/compile.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'
import { solve } from '../../src/stationary/solve.js'

// biome-ignore lint/suspicious/noExplicitAny: the references are JSON of many shapes
type Case = { id: string; model: any; values: any; source: string }

const casesOf = (file: string): Case[] =>
  JSON.parse(readFileSync(`test/published/references/${file}.json`, 'utf8')).cases

function solved(text: string) {
  const model = compile(parseScenario(text, { file: 'reference.yaml' }))
  const chain = explore(model)
  const joined = joinArcs(chain)
  return solve(model, chain, joined, structureOf(chain, joined)).measures
}

const head = (time: string) => `stillmark: 1\ntitle: reference\ntime: ${time}\n`

/** A value with its bound holds the published number: within 1e-12, and the bound is no lie beyond the printed digits. */
function agrees(measure: ReturnType<typeof solved>[string], published: string): void {
  if (!('value' in measure)) throw new Error('a distribution')
  const expected = Number(published)
  const miss = Math.abs(measure.value - expected)
  expect(miss).toBeLessThanOrEqual(1e-12 * Math.abs(expected))
  expect(miss).toBeLessThanOrEqual(measure.errorBound + 2 ** -52 * Math.abs(expected))
}

function sharesAgree(measure: ReturnType<typeof solved>[string], published: readonly string[]): void {
  if (!('points' in measure)) throw new Error('no distribution')
  expect(measure.points.length).toBe(published.length)
  measure.points.forEach(([value, share], i) => {
    expect(value).toBe(i)
    expect(Math.abs(share / Number(published[i]) - 1)).toBeLessThanOrEqual(1e-12)
  })
}

describe('loss systems (Erlang B)', () => {
  const cases = casesOf('erlang').filter(
    ({ model, values }) => model.type === 'M/M/c/c' && values.blocking !== undefined,
  )
  test.each(cases)('$id — $source', ({ model, values }) => {
    const measures = solved(`${head('continuous')}
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate}, places: ${model.servers} }
state: { n: { from: 0, to: places } }
transitions:
  enter: { when: n < places, rate: come, then: { n: n + 1 } }
  lost: { when: n == places, rate: come, then: {} }
  leave: { when: n > 0, rate: n * go, then: { n: n - 1 } }
measures:
  blocking: { ratio: [lost, enter + lost] }
  full: { share: n == places }
  busy: { average: n }
`)
    agrees(measures.blocking, values.blocking)
    agrees(measures.full, values.blocking)
    agrees(measures.busy, values.meanBusy)
  })
})

describe('finite queues', () => {
  const cases = casesOf('single-station').filter(({ model }) => model.type === 'M/M/c/K')
  test.each(cases)('$id — $source', ({ model, values }) => {
    const measures = solved(`${head('continuous')}
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate}, desks: ${model.servers}, room: ${model.capacity} }
quantities: { served: "min(n, desks)" }
state: { n: { from: 0, to: room } }
transitions:
  enter: { when: n < room, rate: come, then: { n: n + 1 } }
  lost: { when: n == room, rate: come, then: {} }
  leave: { when: n > 0, rate: served * go, then: { n: n - 1 } }
measures:
  pi: { distribution: n }
  blocking: { ratio: [lost, lost + enter] }
  inside: { average: n }
  queue: { average: n - served }
  throughput: { frequency: leave }
  time: { ratio: [n, enter] }
  wait: { ratio: [n - served, enter] }
`)
    sharesAgree(measures.pi, values.pi)
    agrees(measures.blocking, values.blocking)
    agrees(measures.inside, values.L)
    agrees(measures.queue, values.Lq)
    agrees(measures.throughput, values.throughput)
    agrees(measures.time, values.W)
    agrees(measures.wait, values.Wq)
  })
})

describe('machine repair', () => {
  const cases = casesOf('single-station').filter(({ model }) => model.type === 'finite-source machine repair')
  test.each(cases)('$id — $source', ({ model, values }) => {
    const measures = solved(`${head('continuous')}
constants: { machines: ${model.machines}, spares: ${model.spares}, hands: ${model.repairers}, fails: ${model.failureRate}, mends: ${model.repairRate} }
quantities: { running: "min(machines, machines + spares - down)" }
state: { down: { from: 0, to: machines + spares } }
transitions:
  fail: { when: running > 0, rate: running * fails, then: { down: down + 1 } }
  mend: { when: down > 0, rate: "min(down, hands) * mends", then: { down: down - 1 } }
measures:
  pi: { distribution: down }
  failed: { average: down }
  running: { average: running }
  busy: { average: "min(down, hands)" }
  all: { share: running == machines }
  time: { ratio: [down, fail] }
`)
    sharesAgree(measures.pi, values.pi)
    agrees(measures.failed, values.meanFailed)
    agrees(measures.running, values.meanRunning)
    agrees(measures.busy, values.meanBusyRepairers)
    agrees(measures.all, values.probAllRunning)
    agrees(measures.time, values.meanTimeFailed)
  })
})

describe('stock', () => {
  test.each(casesOf('inventory-and-reliability').filter(({ id }) => id.startsWith('sS-continuous')))(
    '$id — $source',
    ({ model, values }) => {
      const measures = solved(`${head('continuous')}
constants: { low: ${model.s}, high: ${model.S}, demand: ${model.demandRate}, delivery: ${model.leadTimeRate} }
state: { stock: { from: 0, to: high, start: high } }
transitions:
  sold: { when: stock > 0, rate: demand, then: { stock: stock - 1 } }
  lost: { when: stock == 0, rate: demand, then: {} }
  delivered: { when: stock <= low, rate: delivery, then: { stock: stock + high - low } }
measures:
  pi: { distribution: stock }
  mean: { average: stock }
  lost: { ratio: [lost, sold + lost] }
  orders: { frequency: delivered }
`)
      sharesAgree(measures.pi, values.pi)
      agrees(measures.mean, values.meanStock)
      agrees(measures.lost, values.fractionLost)
      agrees(measures.orders, values.orderRate)
    },
  )
  test.each(casesOf('inventory-and-reliability').filter(({ id }) => id.startsWith('sS-periodic')))(
    '$id — $source',
    ({ model, values }) => {
      const measures = solved(`${head('discrete')}
constants: { low: ${model.s}, high: ${model.S}, demand: ${model.meanDemand} }
quantities: { filled: "if(stock <= low, high, stock)" }
state: { stock: { from: 0, to: high, start: high } }
transitions:
  sold:
    each: { d: { from: 0, to: high - 1 } }
    when: d < filled
    probability: poisson(d, demand)
    then: { stock: filled - d }
  emptied: { probability: "poisson_tail(filled, demand)", then: { stock: 0 } }
measures:
  pi: { distribution: stock }
  mean: { average: stock }
  orders: { share: stock <= low }
`)
      sharesAgree(measures.pi, values.pi)
      agrees(measures.mean, values.meanStock)
      agrees(measures.orders, values.orderFrequency)
    },
  )
})

describe('k of n units', () => {
  test.each(casesOf('inventory-and-reliability').filter(({ id }) => id.startsWith('koon')))(
    '$id — $source',
    ({ model, values }) => {
      const measures = solved(`${head('continuous')}
constants: { k: ${model.k}, n: ${model.n}, hands: ${model.repairers}, fails: ${model.failureRate}, mends: ${model.repairRate} }
state: { down: { from: 0, to: n } }
transitions:
  fail: { when: n - down != k, rate: (n - down) * fails, then: { down: down + 1 } }
  fatal: { when: n - down == k, rate: (n - down) * fails, then: { down: down + 1 } }
  mend: { when: down > 0, rate: "min(down, hands) * mends", then: { down: down - 1 } }
measures:
  pi: { distribution: down }
  up: { share: n - down >= k }
  out: { share: n - down < k }
  failures: { frequency: fatal }
  down_time: { ratio: [n - down < k, fatal] }
  up_time: { ratio: [n - down >= k, fatal] }
`)
      sharesAgree(measures.pi, values.pi)
      agrees(measures.up, values.availability)
      agrees(measures.out, values.unavailability)
      agrees(measures.failures, values.failureFrequency)
      agrees(measures.down_time, values.meanDownTime)
      agrees(measures.up_time, values.meanUpTime)
    },
  )
})

describe('closed networks, with arrays', () => {
  const cases = casesOf('networks').filter(({ model }) => model.type === 'closed product-form network')
  test.each(cases)('$id — $source', ({ model, values }) => {
    const visits = model.visitRatios.map(Number)
    const total = visits.reduce((a: number, b: number) => a + b, 0)
    const servers = model['servers (0 = delay station)']
    const measures = solved(`${head('continuous')}
constants:
  visits: [${model.visitRatios.join(', ')}]
  total: ${total}
  time: [${model.meanServiceTimes.join(', ')}]
  desks: [${servers.map((each: number) => each || model.customers).join(', ')}]
  people: ${model.customers}
state:
  at: { index: { from: 1, to: 3 }, from: 0, to: people, start: [${model.customers}, 0, 0] }
transitions:
  move:
    each: { i: { from: 1, to: 3 }, j: { from: 1, to: 3 } }
    when: at[i] > 0 and i != j
    rate: min(at[i], desks[i]) / time[i] * visits[j] / total
    then:
      at[i]: at[i] - 1
      at[j]: at[j] + 1
  again:
    each: { i: { from: 1, to: 3 } }
    when: at[i] > 0
    rate: min(at[i], desks[i]) / time[i] * visits[i] / total
    then: {}
measures:
  first: { distribution: "at[1]" }
  mean1: { average: "at[1]" }
  mean2: { average: "at[2]" }
  mean3: { average: "at[3]" }
  throughput: { frequency: "sum(j, 1, 3, move[1, j]) + again[1]" }
`)
    sharesAgree(measures.first, values.marginalStation1)
    for (const i of [1, 2, 3]) agrees(measures[`mean${i}`], values.meanNumbers[i - 1])
    // Throughput of station 1 is that of visit ratio 1, which every case gives it.
    agrees(measures.throughput, values.throughput)
  })
})

describe('urns and matrices', () => {
  test.each(casesOf('classic-chains').filter(({ id }) => id.startsWith('ehrenfest')))(
    '$id — $source',
    ({ model, values }) => {
      const measures = solved(`${head('discrete')}
constants: { balls: ${model.balls} }
state: { k: { from: 0, to: balls } }
transitions:
  in: { when: k < balls, probability: (balls - k) / balls, then: { k: k + 1 } }
  out: { when: k > 0, probability: k / balls, then: { k: k - 1 } }
measures: { pi: { distribution: k } }
`)
      sharesAgree(measures.pi, values.pi)
    },
  )
  test.each(casesOf('nearly-decomposable-and-stiff').filter(({ model }) => model.type === 'ctmc'))(
    '$id, by table — $source',
    ({ model, values }) => {
      const size = values.pi.length
      const rows = Array.from({ length: size }, (_, i) => {
        const own = model.rates.filter(([from]: [number]) => from === i)
        return `  s${i}: { ${own.map(([, to, rate]: [number, number, string]) => `s${to}: ${rate}`).join(', ')} }`
      })
      const names = Array.from({ length: size }, (_, i) => `s${i}`)
      const measures = solved(`${head('continuous')}
states: [${names.join(', ')}]
rates:
${rows.join('\n')}
measures:
${names.map((name) => `  in_${name}: { share: [${name}] }`).join('\n')}
`)
      for (const [i, name] of names.entries()) agrees(measures[`in_${name}`], values.pi[i])
    },
  )
  test.each(casesOf('nearly-decomposable-and-stiff').filter(({ model }) => model.type === 'dtmc'))(
    '$id, from a Matrix Market file — $source',
    ({ model, values }) => {
      const entries = model.matrix.flatMap((row: string[], i: number) =>
        row.map((each, j) => `${i + 1} ${j + 1} ${each}`),
      )
      const size = model.matrix.length
      const text = `${head('discrete')}matrix: chain.mtx\nmeasures:\n${values.pi.map((_: string, i: number) => `  m${i + 1}: { share: [s${i + 1}] }`).join('\n')}\n`
      const compiled = compile(
        parseScenario(text, {
          file: 'reference.yaml',
          readBeside: () =>
            `%%MatrixMarket matrix coordinate real general\n${size} ${size} ${entries.length}\n${entries.join('\n')}\n`,
        }),
      )
      const chain = explore(compiled)
      const joined = joinArcs(chain)
      const { measures } = solve(compiled, chain, joined, structureOf(chain, joined))
      for (const [i, share] of values.pi.entries()) agrees(measures[`m${i + 1}`], share)
    },
  )
})
