import { describe, expect, test } from 'vitest'
import { planElimination, type SparseRates } from '../../src/chain/elimination-plan.js'
import { reduceStates, rewardUntilRoot, stationaryVector } from '../../src/chain/state-reduction.js'

/** The slow, obvious version: dense, one state after the other (Grassmann, Taksar and Heyman 1985). */
function plainReduction({ rowStart, target, rate }: SparseRates): Float64Array {
  const n = rowStart.length - 1
  const a = Array.from({ length: n }, () => new Float64Array(n))
  for (let i = 0; i < n; i++) for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) a[i][target[arc]] += rate[arc]
  for (let last = n - 1; last > 0; last--) {
    let leaving = 0
    for (let j = 0; j < last; j++) leaving += a[last][j]
    for (let i = 0; i < last; i++) {
      a[i][last] /= leaving
      for (let j = 0; j < last; j++) a[i][j] += a[i][last] * a[last][j]
    }
  }
  const share = new Float64Array(n)
  share[0] = 1
  let total = 1
  for (let k = 1; k < n; k++) {
    for (let i = 0; i < k; i++) share[k] += share[i] * a[i][k]
    total += share[k]
  }
  return share.map((each) => each / total)
}

const seeded = (seed: number) => () => {
  seed = (Math.imul(seed, 1103515245) + 12345) & 0x7fffffff
  return seed / 0x80000000
}

function ratesOf(size: number, arcs: readonly (readonly [number, number, number])[]): SparseRates {
  const sorted = arcs.toSorted((a, b) => a[0] - b[0])
  const rowStart = new Int32Array(size + 1)
  for (const [from] of sorted) rowStart[from + 1]++
  for (let i = 0; i < size; i++) rowStart[i + 1] += rowStart[i]
  return {
    rowStart,
    target: Int32Array.from(sorted, (arc) => arc[1]),
    rate: Float64Array.from(sorted, (arc) => arc[2]),
  }
}

const nowhere = { values: new Int32Array(0), width: 0 }

/** Stations in series with room for so many each: arrivals at the first, moves on, departures from the last. */
function line(rooms: readonly number[]) {
  const width = rooms.length
  const size = rooms.reduce((product, room) => product * room, 1)
  const values = new Int32Array(size * width)
  const stride = rooms.map((_, k) => rooms.slice(0, k).reduce((product, room) => product * room, 1))
  const arcs: [number, number, number][] = []
  for (let s = 0; s < size; s++) {
    const present = rooms.map((room, k) => Math.floor(s / stride[k]) % room)
    values.set(present, s * width)
    if (present[0] < rooms[0] - 1) arcs.push([s, s + stride[0], 1])
    for (let k = 0; k < width - 1; k++) {
      if (present[k] > 0 && present[k + 1] < rooms[k + 1] - 1)
        arcs.push([s, s - stride[k] + stride[k + 1], 1.1 + 0.1 * k])
    }
    if (present[width - 1] > 0) arcs.push([s, s - stride[width - 1], 1.3])
  }
  return { rates: ratesOf(size, arcs), coordinates: { values, width } }
}

const largestRelative = (a: Float64Array, b: Float64Array) =>
  a.reduce((worst, each, k) => Math.max(worst, Math.abs(each - b[k]) / b[k]), 0)

describe('sparse elimination gives the shares of the plain dense one', () => {
  test.each([[[40]], [[15, 20]], [[6, 7, 8]], [[3, 4, 3, 4]]])(
    'stations with rooms %j, ordered by coordinates',
    (rooms) => {
      const { rates, coordinates } = line(rooms)
      const plan = planElimination(rates, coordinates)
      expect(largestRelative(stationaryVector(reduceStates(rates, plan)), plainReduction(rates))).toBeLessThan(1e-13)
    },
  )

  test.each([[[15, 20]], [[6, 7, 8]]])('stations with rooms %j, ordered by breadth-first levels', (rooms) => {
    const { rates } = line(rooms)
    const plan = planElimination(rates, nowhere)
    expect(plan.fronts).toBeGreaterThan(5)
    expect(largestRelative(stationaryVector(reduceStates(rates, plan)), plainReduction(rates))).toBeLessThan(1e-13)
  })

  test('random graphs of 150 states, dense and sparse, rates over 12 decades', () => {
    for (const arcsPerState of [1, 3, 30]) {
      const random = seeded(arcsPerState)
      const arcs = Array.from({ length: 150 }, (_, k): [number, number, number] => [
        k,
        (k + 1) % 150,
        10 ** (12 * random() - 6),
      ])
      for (let k = 0; k < 150 * arcsPerState; k++) {
        arcs.push([Math.floor(150 * random()), Math.floor(150 * random()), 10 ** (12 * random() - 6)])
      }
      const rates = ratesOf(
        150,
        arcs.filter(([from, to]) => from !== to),
      )
      const reduction = reduceStates(rates, planElimination(rates, nowhere))
      expect(largestRelative(stationaryVector(reduction), plainReduction(rates))).toBeLessThan(1e-12)
    }
  })
})

describe('the plan', () => {
  test('eliminates every state once, and each front’s boundary only later', () => {
    const { rates, coordinates } = line([12, 12, 6])
    const { order, fronts, pivotStart, parent, boundaryStart, boundary } = planElimination(rates, coordinates)
    expect([...order].sort((a, b) => a - b)).toEqual(Array.from({ length: 864 }, (_, k) => k))
    expect(pivotStart[fronts]).toBe(864)
    for (let t = 0; t < fronts; t++) {
      expect(parent[t] > t || (parent[t] === -1 && t === fronts - 1)).toBe(true)
      for (let k = boundaryStart[t]; k < boundaryStart[t + 1]; k++)
        expect(boundary[k]).toBeGreaterThanOrEqual(pivotStart[t + 1])
    }
  })

  test('costs what nested dissection promises on a square grid: operations about as n^1.5, far below n³/3', () => {
    const cost = (side: number) => {
      const { rates, coordinates } = line([side, side])
      return planElimination(rates, coordinates).operations
    }
    const growth = Math.log2(cost(128) / cost(64)) / 2 // exponent in the number of states
    expect(growth).toBeGreaterThan(1.2)
    expect(growth).toBeLessThan(1.7)
  })

  test('keeps the wanted state for the end', () => {
    const { rates, coordinates } = line([9, 9])
    expect(planElimination(rates, coordinates, 40).order[80]).toBe(40)
  })
})

describe('shares beyond the range of a double', () => {
  test.each([
    { up: 1, down: 10 },
    { up: 10, down: 1 },
  ])(
    'a queue of 1,000 places, in at $up and out at $down: ratios of neighbours hold as far as doubles reach',
    ({ up, down }) => {
      const n = 1000
      const arcs = Array.from({ length: n - 1 }, (_, k) => [[k, k + 1, up] as const, [k + 1, k, down] as const]).flat()
      const rates = ratesOf(n, arcs)
      const share = stationaryVector(reduceStates(rates, planElimination(rates, nowhere)))
      const heavy = up < down ? 0 : n - 1
      // Truncated geometric law, by hand: the heaviest share is (1 - r) / (1 - rⁿ) with r = 1/10.
      expect(Math.abs(share[heavy] - 0.9)).toBeLessThan(1e-15)
      for (let k = 0; k < 250; k++) {
        const far = up < down ? k : n - 1 - k
        expect(Math.abs(share[far] / (0.9 * 10 ** -k) - 1)).toBeLessThan(1e-12)
      }
      expect(share.every((each) => each >= 0)).toBe(true)
    },
  )

  test('two states that see each other once in 10^200 time units', () => {
    const rates = ratesOf(3, [
      [0, 1, 1],
      [1, 0, 2],
      [1, 2, 1e-200],
      [2, 1, 4e-200],
    ])
    const share = stationaryVector(reduceStates(rates, planElimination(rates, nowhere)))
    // Balance by hand: share 1 is half of share 0; share 2 is a quarter of share 1.
    for (const [k, eighths] of [8, 4, 1].entries()) expect(Math.abs(share[k] - eighths / 13)).toBeLessThan(1e-15)
  })
})

test('reward until the root: mean time to the root of a ring is what its moves add up to', () => {
  const rates = ratesOf(5, [
    [0, 1, 1],
    [1, 2, 2],
    [2, 3, 4],
    [3, 4, 8],
    [4, 0, 16],
  ])
  const reduction = reduceStates(rates, planElimination(rates, nowhere))
  const time = rewardUntilRoot(reduction, new Float64Array(5).fill(1))
  let expected = 0
  for (let back = 1; back < 5; back++) {
    const state = (reduction.root - back + 5) % 5
    expected += 1 / 2 ** state
    expect(time[state]).toBe(expected)
  }
  expect(time[reduction.root]).toBe(0)
})
