import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { strongComponents } from '../../src/chain/strong-components.js'
import {
  add,
  divide,
  type Fraction,
  fraction,
  fractionOfDouble,
  multiply,
  one,
  subtract,
  toNumber,
  zero,
} from '../../src/numbers/fraction.js'
import { anyChain, periodic, type RandomChain } from '../stationary/random-chains.js'
import { type Move, solveTable } from '../stationary/table-chain.js'

const structureFrom = ({ time, size, moves }: RandomChain, start = 0) =>
  solveTable(time, size, moves, { start }).structure

/** Which states can be reached from which, by squaring until nothing is added: the slow, obvious version. */
function reachable({ size, moves }: RandomChain): boolean[][] {
  const reach = Array.from({ length: size }, (_, i) => Array.from({ length: size }, (_, j) => i === j))
  for (const [from, to] of moves) reach[from][to] = true
  for (let k = 0; k < size; k++) {
    for (let i = 0; i < size; i++) for (let j = 0; j < size; j++) reach[i][j] ||= reach[i][k] && reach[k][j]
  }
  return reach
}

/** Solves a system in fractions by Gauss-Jordan elimination: rows of coefficients, then the right side. */
function solveInFractions(rows: Fraction[][]): Fraction[] {
  const n = rows.length
  for (let k = 0; k < n; k++) {
    const pivot = rows.findIndex((row, i) => i >= k && row[k].numerator !== 0n)
    ;[rows[k], rows[pivot]] = [rows[pivot], rows[k]]
    const by = rows[k][k]
    rows[k] = rows[k].map((each) => divide(each, by))
    for (let i = 0; i < n; i++) {
      const factor = rows[i][k]
      if (i !== k && factor.numerator !== 0n)
        rows[i] = rows[i].map((each, j) => subtract(each, multiply(factor, rows[k][j])))
    }
  }
  return rows.map((row) => row[n])
}

describe('closed classes of any graph', () => {
  test('are the sets of states that reach each other and nothing else; all other states are transient', () =>
    fc.assert(
      fc.property(anyChain, (chain) => {
        const reach = reachable(chain)
        const { classOf, closedClasses, transientStates } = structureFrom(chain)
        const isClosed = (i: number) => reach[i].every((there, j) => !there || reach[j][i])
        for (let i = 0; i < chain.size; i++) {
          expect(classOf[i] >= 0).toBe(isClosed(i))
          if (!isClosed(i)) expect([...transientStates]).toContain(i)
          else expect([...closedClasses[classOf[i]].states]).toEqual(reach[i].flatMap((there, j) => (there ? [j] : [])))
        }
      }),
      { seed: 3, numRuns: 500 },
    ))

  test('are reached with the probabilities, and after the mean time, of the exact linear equations', () =>
    fc.assert(
      fc.property(
        anyChain.chain((chain) => fc.tuple(fc.constant(chain), fc.nat(chain.size - 1))),
        ([chain, start]) => {
          const { closedClasses, classOf, meanTimeToSettle } = structureFrom(chain, start)
          const open = [...classOf].flatMap((own, state) => (own < 0 ? [state] : []))
          const row = (state: number, right: (to: number, rate: Fraction) => Fraction, base: Fraction) => {
            const coefficients = new Array<Fraction>(open.length + 1).fill(zero)
            coefficients[open.length] = base
            for (const [from, to, rate] of chain.moves) {
              if (from !== state) continue
              const exact = fractionOfDouble(rate as number)
              const own = open.indexOf(state)
              coefficients[own] = add(coefficients[own], exact)
              const other = open.indexOf(to)
              if (other >= 0) coefficients[other] = subtract(coefficients[other], exact)
              else coefficients[open.length] = add(coefficients[open.length], right(to, exact))
            }
            return coefficients
          }
          const at = open.indexOf(start)
          closedClasses.forEach(({ reachedWith, reachedWithError }, k) => {
            const exact =
              at < 0
                ? fraction(classOf[start] === k ? 1 : 0)
                : solveInFractions(
                    open.map((state) => row(state, (to, rate) => (classOf[to] === k ? rate : zero), zero)),
                  )[at]
            const off = Math.abs(toNumber(subtract(fractionOfDouble(reachedWith), exact)))
            expect(off).toBeLessThanOrEqual(reachedWithError)
            expect(off).toBeLessThanOrEqual(1e-14 * toNumber(exact))
          })
          const time = at < 0 ? zero : solveInFractions(open.map((state) => row(state, () => zero, one)))[at]
          expect(Math.abs(meanTimeToSettle - toNumber(time))).toBeLessThanOrEqual(1e-14 * toNumber(time))
        },
      ),
      { seed: 5, numRuns: 300 },
    ))

  test('come with reachedWith 0 where the start can’t get there', () => {
    const { closedClasses } = structureFrom({
      time: 'continuous',
      size: 4,
      moves: [
        [0, 1, 1],
        [1, 0, 1],
        [2, 3, 1],
        [3, 2, 1],
      ],
    })
    expect(closedClasses.map(({ reachedWith }) => reachedWith)).toEqual([1, 0])
  })
})

describe('periods', () => {
  test('are the greatest common divisor of the lengths of ways back', () =>
    fc.assert(
      fc.property(periodic, (chain) => {
        const { closedClasses } = structureFrom(chain)
        for (const { states, period } of closedClasses) {
          let present = states.slice(0, 1) as Int32Array | number[]
          let divisor = 0
          for (let step = 1; step <= 2 * chain.size ** 2; step++) {
            const next = new Set<number>()
            for (const [from, to] of chain.moves) if ([...present].includes(from)) next.add(to)
            present = [...next]
            if (next.has(states[0])) {
              let [a, b] = [divisor, step]
              while (b !== 0) [a, b] = [b, a % b]
              divisor = a
            }
          }
          expect(period).toBe(divisor)
        }
      }),
      { seed: 9, numRuns: 60 },
    ))

  test('are 1 in continuous time, whatever the graph', () => {
    const { closedClasses } = structureFrom({
      time: 'continuous',
      size: 2,
      moves: [
        [0, 1, 1],
        [1, 0, 1],
      ],
    })
    expect(closedClasses[0].period).toBe(1)
  })
})

test('counts distinct pairs, staying included, and adds parallel arcs', () => {
  const { structure, joined } = solveTable('discrete', 2, [
    [0, 0, 0.25],
    [0, 1, 0.5],
    [0, 1, 0.25],
    [1, 0, 1],
  ])
  expect(structure.transitions).toBe(3)
  expect([...joined.target]).toEqual([0, 1, 0])
  expect([...joined.rate]).toEqual([0.25, 0.75, 1])
})

test('a path of a million states needs no deep call stack', () => {
  const n = 1_000_000
  const rowStart = Int32Array.from({ length: n + 1 }, (_, k) => Math.min(k, n - 1))
  const target = Int32Array.from({ length: n - 1 }, (_, k) => k + 1)
  const { count, componentOf } = strongComponents(rowStart, target)
  expect(count).toBe(n)
  expect(componentOf[0]).toBe(n - 1)
  const ring = strongComponents(
    Int32Array.from({ length: n + 1 }, (_, k) => k),
    Int32Array.from({ length: n }, (_, k) => (k + 1) % n),
  )
  expect(ring.count).toBe(1)
})

test('a way out of one in 10^30 keeps its digits', () => {
  // From 0: to the rare class through a chain of three moves of 1e-10 against 1. By hand: p = (1e-10 / (1 + 1e-10))³.
  const moves: Move[] = [
    [0, 3, 1],
    [0, 1, 1e-10],
    [1, 3, 1],
    [1, 2, 1e-10],
    [2, 3, 1],
    [2, 4, 1e-10],
  ]
  const { closedClasses } = structureFrom({ time: 'continuous', size: 5, moves })
  const p = (1e-10 / (1 + 1e-10)) ** 3
  expect(Math.abs(closedClasses[1].reachedWith - p)).toBeLessThanOrEqual(1e-14 * p)
  expect(closedClasses[1].reachedWithError).toBeLessThanOrEqual(1e-12 * p)
})
