/**
 * The unbounded reference cases written as a user would write them: a scenario's text, read, compiled, classified and
 * solved. Each test prints the case's own source. Tolerance 1e-12 relative, and every bound has to be true.
 */
import { readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { compile } from '../../src/model/compile.js'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'
import type { ExactAnswer, ExactMeasure } from '../../src/stationary/exact-answer.js'
import { solveUnbounded } from '../../src/stationary/solve-unbounded.js'

// biome-ignore lint/suspicious/noExplicitAny: the references are JSON of many shapes
type Case = { id: string; model: any; values: any; source: string }

const casesOf = (file: string): Case[] =>
  JSON.parse(readFileSync(`test/published/references/${file}.json`, 'utf8')).cases
const ofType = (file: string, ...types: string[]) => casesOf(file).filter(({ model }) => types.includes(model.type))

function solved(body: string): ExactAnswer {
  const model = compile(parseScenario(`stillmark: 1\ntitle: reference\ntime: continuous\n${body}`, { file: 'r.yaml' }))
  if (model.kind !== 'variables') throw new Error('a table')
  const answer = solveUnbounded(model, classifyCountable(model, { withoutRemedies: true }))
  if (answer === undefined) throw new Error('not solved')
  return answer
}

/** Half a unit of the 25th digit, which is all that is printed, is far below a double's. */
function agrees(measure: ExactMeasure, published: string, tolerance = 1e-12): void {
  if (!('value' in measure)) throw new Error('a distribution')
  const expected = Number(published)
  const miss = Math.abs(measure.value - expected)
  expect(miss).toBeLessThanOrEqual(tolerance * Math.abs(expected))
  expect(miss).toBeLessThanOrEqual(measure.errorBound + 2 ** -53 * Math.abs(expected))
  expect(measure.errorBound).toBeLessThanOrEqual(1e-10 * Math.abs(expected))
}

describe('M/M/1', () => {
  test.each(ofType('single-station', 'M/M/1'))('$id — $source', ({ model, values }) => {
    const { measures } = solved(`
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate} }
state: { n: { from: 0, start: 0 } }
transitions:
  enter: { rate: come, then: { n: n + 1 } }
  leave: { when: n > 0, rate: go, then: { n: n - 1 } }
measures:
  busy: { share: n > 0 }
  p0: { share: n == 0 }
  p5: { share: n == 5 }
  ten: { share: n >= 10 }
  inside: { average: n }
  queue: { average: "max(n - 1, 0)" }
  second: { average: n^2 }
  time: { ratio: [n, enter] }
  wait: { ratio: ["max(n - 1, 0)", enter] }
  leaving: { frequency: leave }
  q: { quantile: n, level: 0.9 }
  all: { distribution: n }
`)
    agrees(measures.busy, values.rho)
    agrees(measures.p0, values.p0)
    agrees(measures.p5, values.p5)
    agrees(measures.ten, values.probAtLeast10)
    agrees(measures.inside, values.L)
    agrees(measures.queue, values.Lq)
    agrees(measures.second, String(Number(values.varianceNumber) + Number(values.L) ** 2))
    agrees(measures.time, values.W)
    agrees(measures.wait, values.Wq)
    agrees(measures.leaving, model.arrivalRate)
    const { all, q } = measures
    if (!('points' in all) || !('value' in q)) throw new Error('kinds')
    expect(Math.abs(all.points[5][1] / Number(values.p5) - 1)).toBeLessThan(1e-13)
    expect(q.value).toBe(Math.ceil(Math.log(0.1) / Math.log(Number(values.rho)) - 1e-9) - 1)
  })
})

describe('M/M/c', () => {
  test.each(ofType('erlang', 'M/M/c'))('$id — $source', ({ model, values }) => {
    const { measures } = solved(`
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate}, desks: ${model.servers} }
quantities: { queue: "max(n - desks, 0)" }
state: { n: { from: 0, start: 0 } }
transitions:
  enter: { rate: come, then: { n: n + 1 } }
  leave: { when: n > 0, rate: "min(n, desks) * go", then: { n: n - 1 } }
measures:
  waits: { share: n >= desks }
  queue: { average: queue }
  inside: { average: n }
  wait: { ratio: [queue, enter] }
  p0: { share: n == 0 }
`)
    agrees(measures.waits, values.probWait)
    agrees(measures.queue, values.meanQueue)
    agrees(measures.inside, values.meanInSystem)
    agrees(measures.wait, values.meanWaitInQueue)
    agrees(measures.p0, values.p0)
  })
})

describe('M/M/∞', () => {
  test.each(ofType('single-station', 'M/M/inf'))('$id — $source', ({ model, values }) => {
    const points = Object.keys(values).filter((key) => /^p\d+$/.test(key))
    const { measures } = solved(`
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate} }
state: { n: { from: 0, start: 0 } }
transitions:
  enter: { rate: come, then: { n: n + 1 } }
  leave: { when: n > 0, rate: n * go, then: { n: n - 1 } }
measures:
  inside: { average: n }
  spread: { average: "(n - come / go)^2" }
${points.map((key) => `  ${key}: { share: n == ${key.slice(1)} }`).join('\n')}
`)
    agrees(measures.inside, values.L)
    agrees(measures.spread, values.varianceNumber)
    for (const key of points) agrees(measures[key], values[key])
  })
})

describe('Erlang-A', () => {
  test.each(ofType('single-station', 'M/M/c+M'))('$id — $source', ({ model, values }) => {
    const { measures } = solved(`
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate}, desks: ${model.servers}, lose: ${model.abandonRate} }
quantities: { queue: "max(n - desks, 0)" }
state: { n: { from: 0, start: 0 } }
transitions:
  enter: { rate: come, then: { n: n + 1 } }
  leave: { when: n > 0, rate: "min(n, desks) * go", then: { n: n - 1 } }
  abandon: { when: n > desks, rate: "queue * lose", then: { n: n - 1 } }
measures:
  p0: { share: n == 0 }
  full: { share: n == desks }
  waits: { share: n >= desks }
  abandon: { ratio: [abandon, enter] }
  queue: { average: queue }
  busy: { average: "min(n, desks)" }
  wait: { ratio: [queue, enter] }
`)
    agrees(measures.p0, values.p0)
    agrees(measures.full, values.p_c)
    agrees(measures.waits, values.probWait)
    agrees(measures.abandon, values.probAbandon)
    agrees(measures.queue, values.meanQueue)
    agrees(measures.busy, values.meanBusy)
    agrees(measures.wait, values.meanWaitInQueue)
  })
})

test('linear growth with immigration', () => {
  const [{ values }] = casesOf('single-station').filter(({ id }) => id === 'linear-growth-immigration-0.5-1-2')
  const { measures } = solved(`
state: { n: { from: 0, start: 0 } }
transitions:
  birth: { rate: 0.5 * n + 2, then: { n: n + 1 } }
  death: { when: n > 0, rate: n, then: { n: n - 1 } }
measures:
  p0: { share: n == 0 }
  p1: { share: n == 1 }
  p5: { share: n == 5 }
  mean: { average: n }
  spread: { average: (n - 4)^2 }
`)
  agrees(measures.p0, values.p0)
  agrees(measures.p1, values.p1)
  agrees(measures.p5, values.p5)
  agrees(measures.mean, values.L)
  agrees(measures.spread, values.varianceNumber)
})

describe('arrivals and service by phase', () => {
  test.each(ofType('matrix-geometric', 'MAP/M/1 with phase-dependent service'))(
    '$id — $source',
    ({ model, values }) => {
      const phases = model.serviceRateByPhase.length
      const turns: string[] = []
      for (let i = 0; i < phases; i++) {
        for (let j = 0; j < phases; j++) {
          const silent = model.D0[i][j]
          if (i !== j && Number(silent) !== 0)
            turns.push(`  turn_${i}_${j}: { when: phase == ${i}, rate: ${silent}, then: { phase: ${j} } }`)
          if (Number(model.D1[i][j]) !== 0)
            turns.push(
              `  enter_${i}_${j}: { when: phase == ${i}, rate: ${model.D1[i][j]}, then: { n: n + 1, phase: ${j} } }`,
            )
        }
        if (Number(model.serviceRateByPhase[i]) !== 0)
          turns.push(
            `  leave_${i}: { when: phase == ${i} and n > 0, rate: ${model.serviceRateByPhase[i]}, then: { n: n - 1 } }`,
          )
      }
      const levels = [0, 1, 3]
      const { measures } = solved(`
state: { n: { from: 0, start: 0 }, phase: { from: 0, to: ${phases - 1}, start: 0 } }
transitions:
${turns.join('\n')}
measures:
  empty: { share: n == 0 }
  mean: { average: n }
${levels.flatMap((n) => Array.from({ length: phases }, (_, i) => `  p_${n}_${i}: { share: n == ${n} and phase == ${i} }`)).join('\n')}
`)
      agrees(measures.empty, values.probLevel0)
      agrees(measures.mean, values.meanLevel)
      for (const n of levels) {
        for (let i = 0; i < phases; i++) agrees(measures[`p_${n}_${i}`], values[`pi_level${n}`][i])
      }
    },
  )
})

test('a retrial station with a constant retrial rate', () => {
  const [{ model, values }] = casesOf('matrix-geometric').filter(({ id }) => id.startsWith('retrial'))
  const { measures } = solved(`
constants: { come: ${model.arrivalRate}, go: ${model.serviceRate}, again: ${model.retrialRate} }
state: { orbit: { from: 0, start: 0 }, busy: { from: 0, to: 1, start: 0 } }
transitions:
  enter: { when: busy == 0, rate: come, then: { busy: 1 } }
  refused: { when: busy == 1, rate: come, then: { orbit: orbit + 1 } }
  retry: { when: busy == 0 and orbit > 0, rate: again, then: { busy: 1, orbit: orbit - 1 } }
  leave: { when: busy == 1, rate: go, then: { busy: 0 } }
measures:
  idle0: { share: busy == 0 and orbit == 0 }
  busy0: { share: busy == 1 and orbit == 0 }
  idle3: { share: busy == 0 and orbit == 3 }
  busy3: { share: busy == 1 and orbit == 3 }
  busy: { share: busy == 1 }
  orbit: { average: orbit }
`)
  agrees(measures.idle0, values.p_idle_orbit0)
  agrees(measures.busy0, values.p_busy_orbit0)
  agrees(measures.idle3, values.p_idle_orbit3)
  agrees(measures.busy3, values.p_busy_orbit3)
  agrees(measures.busy, values.probBusy)
  agrees(measures.orbit, values.meanOrbit)
})

describe('service in phases', () => {
  test.each(ofType('mg1-and-phase-type', 'M/E_k/1', 'M/H2/1', 'M/PH/1'))('$id — $source', ({ model, values }) => {
    const { alpha, S } = model
    const number = (text: string) =>
      text.includes('/') ? Number(text.split('/')[0]) / Number(text.split('/')[1]) : Number(text)
    const lines: string[] = []
    for (let i = 0; i < 2; i++) {
      if (number(alpha[i]) > 0) {
        lines.push(`  first_${i}: { when: n == 0, rate: "come * (${alpha[i]})", then: { n: 1, phase: ${i + 1} } }`)
      }
      const j = 1 - i
      if (number(S[i][j]) > 0)
        lines.push(`  next_${i}: { when: phase == ${i + 1}, rate: ${S[i][j]}, then: { phase: ${j + 1} } }`)
      const exit = `(0 - (${S[i][0]}) - (${S[i][1]}))`
      if (Math.abs(number(S[i][0]) + number(S[i][1])) < 1e-12) continue
      lines.push(`  last_${i}: { when: phase == ${i + 1} and n == 1, rate: "${exit}", then: { n: 0, phase: 0 } }`)
      for (let k = 0; k < 2; k++) {
        if (number(alpha[k]) > 0)
          lines.push(
            `  done_${i}_${k}: { when: phase == ${i + 1} and n > 1, rate: "${exit} * (${alpha[k]})", then: { n: n - 1, phase: ${k + 1} } }`,
          )
      }
    }
    const { measures } = solved(`
constants: { come: ${model.arrivalRate} }
state: { n: { from: 0, start: 0 }, phase: { from: 0, to: 2, start: 0 } }
transitions:
${lines.join('\n')}
  enter: { when: n > 0, rate: come, then: { n: n + 1 } }
measures:
${[0, 1, 2, 3, 4, 5].map((k) => `  p${k}: { share: n == ${k} }`).join('\n')}
  inside: { average: n }
  time: { ratio: [n, enter${[0, 1].map((i) => (number(alpha[i]) > 0 ? ` + first_${i}` : '')).join('')}] }
`)
    for (const [k, share] of values.p0_to_p5.entries()) agrees(measures[`p${k}`], share)
    agrees(measures.inside, values.L)
    agrees(measures.time, values.W)
  })
})

test('arrivals in stages: e2-m-1', () => {
  const [{ model, values }] = casesOf('mg1-and-phase-type').filter(({ id }) => id === 'e2-m-1')
  const { measures } = solved(`
constants: { stage: ${model.stageRate}, go: ${model.serviceRate} }
state: { n: { from: 0, start: 0 }, passed: { from: 0, to: 1, start: 0 } }
transitions:
  pass: { when: passed == 0, rate: stage, then: { passed: 1 } }
  enter: { when: passed == 1, rate: stage, then: { passed: 0, n: n + 1 } }
  leave: { when: n > 0, rate: go, then: { n: n - 1 } }
measures:
  p0: { share: n == 0 }
  p3: { share: n == 3 }
  inside: { average: n }
  time: { ratio: [n, enter] }
`)
  agrees(measures.p0, values.p0_time)
  agrees(measures.p3, values.p3_time)
  agrees(measures.inside, values.L)
  agrees(measures.time, values.W)
})

describe('open networks', () => {
  test.each(ofType('networks', 'open Jackson network'))('$id — $source', ({ model, values }) => {
    const stations = model.serviceRates.length
    const list = (each: (i: number) => string) => Array.from({ length: stations }, (_, i) => each(i)).join('\n')
    const all = (each: (i: number) => string) => Array.from({ length: stations }, (_, i) => each(i)).join(' + ')
    const moves: string[] = []
    const entries: string[] = []
    for (let i = 0; i < stations; i++) {
      if (Number(model.externalArrivals[i]) > 0) {
        entries.push(`enter${i}`)
        moves.push(`  enter${i}: { rate: ${model.externalArrivals[i]}, then: { n${i}: n${i} + 1 } }`)
      }
      const rate = `min(n${i}, ${model.servers[i]}) * ${model.serviceRates[i]}`
      let rest = '1'
      for (let j = 0; j < stations; j++) {
        const share = model.routing[i][j]
        if (Number(share) === 0) continue
        rest += ` - ${share}`
        moves.push(
          `  go${i}_${j}: { when: n${i} > 0, rate: "${rate} * ${share}", then: { n${i}: n${i} - 1, n${j}: n${j} + 1 } }`,
        )
      }
      moves.push(`  out${i}: { when: n${i} > 0, rate: "${rate} * (${rest})", then: { n${i}: n${i} - 1 } }`)
    }
    const departures = (i: number) =>
      moves.flatMap((line) =>
        line.startsWith(`  go${i}_`) || line.startsWith(`  out${i}:`) ? [line.trim().split(':')[0]] : [],
      )
    const { measures } = solved(`
state: { ${Array.from({ length: stations }, (_, i) => `n${i}: { from: 0, start: 0 }`).join(', ')} }
transitions:
${moves.join('\n')}
measures:
${list((i) => `  mean${i}: { average: n${i} }`)}
${list((i) => `  empty${i}: { share: n${i} == 0 }`)}
${list((i) => `  through${i}: { frequency: "${departures(i).join(' + ')}" }`)}
  total: { average: "${all((i) => `n${i}`)}" }
  stay: { ratio: ["${all((i) => `n${i}`)}", "${entries.join(' + ')}"] }
`)
    for (const [i, value] of values.meanNumbers.entries()) agrees(measures[`mean${i}`], value)
    for (const [i, value] of values.probStationEmpty.entries()) agrees(measures[`empty${i}`], value)
    for (const [i, value] of values.throughputs.entries()) agrees(measures[`through${i}`], value)
    agrees(measures.total, values.totalMeanNumber)
    agrees(measures.stay, values.meanSojourn)
  })
})
