import fc from 'fast-check'
import { EigenvalueDecomposition, Matrix } from 'ml-matrix'
import { describe, expect, test } from 'vitest'
import {
  absolute,
  compare,
  divide,
  type Fraction,
  fractionOfDouble,
  subtract,
  toNumber,
} from '../../src/numbers/fraction.js'
import { exactMean, solveRationally } from '../../src/stationary/rational-solution.js'
import { irreducible, periodic, type RandomChain } from './random-chains.js'
import { averageOf, exactly, solveTable } from './table-chain.js'

const exactShares = ({ size, moves }: RandomChain): Fraction[] =>
  solveRationally(
    size,
    moves.map(([from, to, rate]) => ({ from, to, rate: exactly(rate) })),
  )

const relativeOff = (computed: number, exact: Fraction): number =>
  toNumber(absolute(divide(subtract(fractionOfDouble(computed), exact), exact)))

const solved = ({ time, size, moves }: RandomChain, values: readonly number[] = []) =>
  solveTable(time, size, moves, { measures: values.length === 0 ? [] : [averageOf('mean', values)] })

const valuesFor = (size: number) =>
  fc.oneof(
    fc.array(fc.double({ min: -100, max: 100, noNaN: true }), { minLength: size, maxLength: size }),
    // Share of a single state: often a rare one.
    fc.nat(size - 1).map((state) => Array.from({ length: size }, (_, k) => (k === state ? 1 : 0))),
  )

describe.each(Object.entries(irreducible))('%s chains', (_name, chains) => {
  test('every share has 14 digits of the exact fraction, and its bound is true', () =>
    fc.assert(
      fc.property(chains, (chain) => {
        const { answer } = solved(chain)
        exactShares(chain).forEach((share, k) => {
          const off = relativeOff(answer.shares?.[k] as number, share)
          expect(off).toBeLessThanOrEqual(5e-15)
          expect(off).toBeLessThanOrEqual(answer.sharesRelativeError as number)
        })
      }),
      { seed: 7, numRuns: 400 },
    ))

  test('the error bound of a mean is true, and at most 10,000 times the error or the last bit', () =>
    fc.assert(
      fc.property(
        chains.chain((chain) => fc.tuple(fc.constant(chain), valuesFor(chain.size))),
        ([chain, values]) => {
          const { answer } = solved(chain, values)
          const { value, errorBound } = answer.measures.mean as { value: number; errorBound: number }
          const shares = exactShares(chain)
          const exact = exactMean(shares, values.map(fractionOfDouble))
          const off = absolute(subtract(fractionOfDouble(value), exact))
          expect(compare(off, fractionOfDouble(errorBound))).toBeLessThanOrEqual(0)
          const magnitude = exactMean(
            shares,
            values.map((each) => fractionOfDouble(Math.abs(each))),
          )
          const lastBit = 2 ** -53 * toNumber(magnitude)
          expect(errorBound).toBeLessThanOrEqual(1e4 * Math.max(toNumber(off), lastBit, 1e-300))
        },
      ),
      { seed: 11, numRuns: 400 },
    ))

  test('what flows into a state flows out of it, to 1e-14 of the flow', () =>
    fc.assert(
      fc.property(chains, (chain) => {
        const shares = solved(chain).answer.shares as Float64Array
        const into = new Float64Array(chain.size)
        const out = new Float64Array(chain.size)
        for (const [from, to, rate] of chain.moves) {
          into[to] += shares[from] * (rate as number)
          out[from] += shares[from] * (rate as number)
        }
        for (let k = 0; k < chain.size; k++) expect(Math.abs(into[k] - out[k])).toBeLessThanOrEqual(1e-14 * out[k])
      }),
      { seed: 13, numRuns: 200 },
    ))

  test('a clock twice as fast leaves every digit', () =>
    fc.assert(
      fc.property(chains, (chain) => {
        const faster = {
          ...chain,
          moves: chain.moves.map(([from, to, rate]) => [from, to, (rate as number) * 2] as const),
        }
        expect(solved(faster).answer.shares).toEqual(solved(chain).answer.shares)
      }),
      { seed: 17, numRuns: 200 },
    ))

  test('relabelled states carry their shares along', () =>
    fc.assert(
      fc.property(
        chains.chain((chain) =>
          fc.tuple(
            fc.constant(chain),
            fc.shuffledSubarray(
              Array.from({ length: chain.size }, (_, k) => k),
              { minLength: chain.size },
            ),
          ),
        ),
        ([chain, place]) => {
          const shares = solved(chain).answer.shares as Float64Array
          const moved = {
            ...chain,
            moves: chain.moves.map(([from, to, rate]) => [place[from], place[to], rate] as const),
          }
          const after = solved(moved).answer.shares as Float64Array
          for (let k = 0; k < chain.size; k++) {
            expect(Math.abs(after[place[k]] - shares[k])).toBeLessThanOrEqual(1e-14 * shares[k])
          }
        },
      ),
      { seed: 19, numRuns: 200 },
    ))

  test('a state split in two equal halves has its share split', () =>
    fc.assert(
      fc.property(
        chains.filter(({ size }) => size > 1),
        (chain) => {
          const twin = chain.size // of state 0: same ways out, half of each way in
          const moves = chain.moves.flatMap(([from, to, rate]) => {
            const sources = from === 0 ? [0, twin] : [from]
            return sources.flatMap((source) =>
              to === 0
                ? [[source, 0, (rate as number) / 2] as const, [source, twin, (rate as number) / 2] as const]
                : [[source, to, rate] as const],
            )
          })
          const whole = solved(chain).answer.shares as Float64Array
          const split = solved({ ...chain, size: chain.size + 1, moves }).answer.shares as Float64Array
          expect(Math.abs(split[0] + split[twin] - whole[0])).toBeLessThanOrEqual(1e-14 * whole[0])
          for (let k = 1; k < chain.size; k++)
            expect(Math.abs(split[k] - whole[k])).toBeLessThanOrEqual(1e-14 * whole[k])
        },
      ),
      { seed: 23, numRuns: 200 },
    ))
})

describe('against other methods', () => {
  test('agrees with the left eigenvector of eigenvalue 0 by ml-matrix, where that is accurate', () =>
    fc.assert(
      fc.property(
        irreducible.mild.filter(({ size }) => size > 1),
        ({ time, size, moves }) => {
          const generator = Matrix.zeros(size, size)
          for (const [from, to, rate] of moves) {
            generator.set(from, to, rate as number)
            generator.set(from, from, generator.get(from, from) - (rate as number))
          }
          const decomposition = new EigenvalueDecomposition(generator.transpose())
          const sizes = decomposition.realEigenvalues.map((real, k) =>
            Math.hypot(real, decomposition.imaginaryEigenvalues[k]),
          )
          const ranked = sizes.map((_, k) => k).sort((a, b) => sizes[a] - sizes[b])
          // Accurate where the eigenvalue 0 stands apart; the tolerance is that of the eigen-solver, not ours.
          fc.pre(sizes[ranked[1]] > 1e-2)
          const vector = decomposition.eigenvectorMatrix.getColumn(ranked[0])
          const total = vector.reduce((sum, each) => sum + each, 0)
          const shares = solveTable(time, size, moves).answer.shares as Float64Array
          for (let k = 0; k < size; k++) expect(Math.abs(vector[k] / total - shares[k])).toBeLessThanOrEqual(1e-9)
        },
      ),
      { seed: 29, numRuns: 200 },
    ))

  const power = (size: number, moves: RandomChain['moves'], doublings: number) => {
    let matrix = Matrix.zeros(size, size)
    for (const [from, to, p] of moves) matrix.set(from, to, matrix.get(from, to) + (p as number))
    for (let k = 0; k < doublings; k++) matrix = matrix.mmul(matrix)
    return matrix
  }

  test('rows of a high power come to the same shares where the chain is aperiodic', () => {
    const moves = [
      [0, 1, 0.5],
      [0, 0, 0.5],
      [1, 2, 1],
      [2, 0, 0.75],
      [2, 1, 0.25],
    ] as const
    const { answer, structure } = solveTable('discrete', 3, moves)
    expect(structure.closedClasses[0].period).toBe(1)
    const high = power(3, moves, 10)
    for (let i = 0; i < 3; i++)
      for (let j = 0; j < 3; j++) expect(high.get(i, j)).toBeCloseTo(answer.shares?.[j] as number, 12)
  })

  test('and do not where it is periodic: there their mean over one period does', () => {
    const moves = [
      [0, 1, 0.25],
      [0, 3, 0.75],
      [1, 2, 1],
      [3, 2, 1],
      [2, 0, 1],
    ] as const
    const { answer, structure } = solveTable('discrete', 4, moves)
    expect(structure.closedClasses[0].period).toBe(3)
    const step = power(4, moves, 0)
    const first = power(4, moves, 10)
    const second = first.mmul(step)
    const third = second.mmul(step)
    expect(Math.abs(first.get(0, 0) - (answer.shares?.[0] as number))).toBeGreaterThan(0.1)
    for (let j = 0; j < 4; j++) {
      expect((first.get(0, j) + second.get(0, j) + third.get(0, j)) / 3).toBeCloseTo(answer.shares?.[j] as number, 12)
    }
  })

  test('time averages of periodic chains are the exact ones', () =>
    fc.assert(
      fc.property(periodic, (chain) => {
        const { answer, structure } = solved(chain)
        fc.pre(structure.closedClasses.length === 1 && structure.transientStates.length === 0)
        expect(structure.closedClasses[0].period).toBeGreaterThan(1)
        exactShares(chain).forEach((share, k) => {
          expect(relativeOff(answer.shares?.[k] as number, share)).toBeLessThanOrEqual(5e-15)
        })
      }),
      { seed: 31, numRuns: 200 },
    ))
})
