import { readdirSync, readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { solve } from '../../src/jobs/solve.js'
import { readScenario } from '../../src/scenario/read-scenario.js'

const files = readdirSync('scenarios').filter((name) => name.endsWith('.yaml'))

describe('every shipped scenario', () => {
  test.each(files)('%s can be used, opens with its situation, and says what its author expects', async (name) => {
    expect(readFileSync(`scenarios/${name}`, 'utf8')).toMatch(/^# [A-Z].*[.]\n/)
    const { measures, expect: expected, title } = await readScenario(`scenarios/${name}`)
    expect(title.length).toBeLessThanOrEqual(60)
    expect(measures.length).toBeGreaterThan(0)
    expect(expected).toBeDefined()
  })
})

/** Exact value of each measure that has one. */
async function solved(name: string): Promise<Record<string, number>> {
  const { document } = await solve(`scenarios/${name}.yaml`)
  return Object.fromEntries(
    Object.entries(document.exact?.measures ?? {}).flatMap(([key, each]) =>
      'value' in each ? [[key, each.value]] : [],
    ),
  )
}

const close = (found: number, expected: number) => expect(Math.abs(found / expected - 1)).toBeLessThan(1e-12)

/** Shares of a birth-death chain on 0 … n: each is the one before times birth over death. By hand, no solver. */
function birthDeath(n: number, birth: (k: number) => number, death: (k: number) => number): number[] {
  const weights = [1]
  for (let k = 0; k < n; k++) weights.push((weights[k] * birth(k)) / death(k + 1))
  const total = weights.reduce((a, b) => a + b, 0)
  return weights.map((each) => each / total)
}
const mean = (shares: readonly number[], value: (k: number) => number) =>
  shares.reduce((sum, share, k) => sum + share * value(k), 0)

describe('exact values of the shipped scenarios, worked out by hand beside the program', () => {
  test('parcel lockers: Erlang’s loss formula by its recursion', async () => {
    let lost = 1
    for (let n = 1; n <= 24; n++) lost = (22.5 * lost) / (n + 22.5 * lost)
    const values = await solved('parcel-lockers')
    close(values.full, lost)
    close(values.mean_occupied, 22.5 * (1 - lost))
  })

  test('loading bays: product form cut off at six bays', async () => {
    const a = 4.5 * 0.4
    const b = 1.2 * 1.5
    const factorial = [1, 1, 2, 6, 24, 120, 720]
    let total = 0
    let full = 0
    let noRoomForTwo = 0
    for (let t = 0; t <= 3; t++)
      for (let v = 0; v + 2 * t <= 6; v++) {
        const weight = (a ** v / factorial[v]) * (b ** t / factorial[t])
        total += weight
        if (v + 2 * t === 6) full += weight
        if (v + 2 * t >= 5) noRoomForTwo += weight
      }
    const values = await solved('loading-bays')
    close(values.vans_lost, full / total)
    close(values.trailers_lost, noRoomForTwo / total)
  })

  test('two repairers: birth and death, and the mean time down by Little’s law', async () => {
    const shares = birthDeath(
      12,
      (down) => (12 - down) / 40,
      (down) => Math.min(down, 2) / 5,
    )
    const down = mean(shares, (k) => k)
    const values = await solved('two-repairers')
    close(values.mean_running, 12 - down)
    close(
      values.repairers_busy,
      mean(shares, (k) => Math.min(k, 2) / 2),
    )
    close(values.time_down, down / mean(shares, (k) => (12 - k) / 40))
  })

  test('hire desk: birth and death; those who give up, find the number engaged or are served are all callers', async () => {
    const shares = birthDeath(
      14,
      () => 1.8,
      (k) => Math.min(k, 6) / 3.5 + Math.max(0, k - 6) / 4,
    )
    const waiting = mean(shares, (k) => Math.max(0, k - 6))
    const values = await solved('call-desk-with-patience')
    close(values.mean_waiting, waiting)
    close(values.gave_up, waiting / 4 / 1.8)
    close(values.found_engaged, shares[14])
    close(values.gave_up + values.found_engaged + (values.desks_busy * 6) / 3.5 / 1.8, 1)
  })

  test('pumps: the flows across each cut between up and up + 1 balance', async () => {
    // Upwards only by repair, downwards by own failures from just above and by grit from anywhere above.
    const own = 1 / 120
    const grit = 1 / 400
    const weights = [0, 0, 0, 0, 1]
    let above = 1
    for (let up = 3; up >= 0; up--) {
      weights[up] = (weights[up + 1] * (up + 1) * own + above * grit) * 6
      above += weights[up]
    }
    const total = above
    const values = await solved('pumps-with-common-cause')
    close(values.cooling_down, (weights[0] + weights[1]) / total)
    close(values.all_up, 1 / total)
    close(values.outages_by_grit, (grit * (total - weights[0])) / total)
  })

  test('two suppliers: the mixture of 1/7 late with the one and 1/3 with the other', async () => {
    const values = await solved('two-suppliers')
    close(values.late, 0.6 / 7 + 0.4 / 3)
    close(values.with_north, 0.6)
  })

  test('rota: a third of the shifts are nights, three tenths of these call-outs', async () => {
    const values = await solved('shift-rota')
    close(values.nights, 1 / 3)
    close(values.call_outs, 0.1)
    close(values.load, (1 + 1 + 0.7 * 0.4 + 0.3 * 1.6) / 3)
  })

  test('cutter: one renewal from keen to keen', async () => {
    // Mean shifts in a cycle: keen 1/0.06, worn 1/0.10, poor 1/0.25; then grinding 1 with 4/5, broken 3 with 1/5.
    const cycle = 1 / 0.06 + 10 + 4 + 0.8 * 1 + 0.2 * 3
    const values = await solved('wear-and-inspection')
    close(values.broken, 0.6 / cycle)
    close(values.grindings, 0.8 / cycle)
    close(values.breakages, 0.2 / cycle)
  })

  test('drill bits: the same chain walked step by step until it stands still', async () => {
    const poisson = (k: number): number => (k === 0 ? Math.exp(-4.2) : (poisson(k - 1) * 4.2) / k)
    let shares = new Map([[20, 1]])
    for (let day = 0; day < 400; day++) {
      const next = new Map<number, number>()
      for (const [stock, share] of shares) {
        let left = 1
        for (let d = 0; stock - d > 6; d++) {
          next.set(stock - d, (next.get(stock - d) ?? 0) + share * poisson(d))
          left -= poisson(d)
        }
        next.set(20, (next.get(20) ?? 0) + share * left)
      }
      shares = next
    }
    const values = await solved('reorder-stock')
    const found = [...shares].reduce((sum, [stock, share]) => sum + stock * share, 0)
    expect(Math.abs(values.mean_stock / found - 1)).toBeLessThan(1e-11)
  })

  test('cold store: by symmetry half the time in either mode', async () =>
    close((await solved('summer-and-winter-mode')).winter, 0.5))

  test('three benches: what comes in goes out, and Little’s law holds', async () => {
    const values = await solved('three-station-line')
    close(values.throughput, 5 * (1 - values.refused_share))
    close(values.in_line, values.throughput * values.time_in_line)
  })
})
