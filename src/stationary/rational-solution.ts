import { add, divide, type Fraction, multiply, sign, subtract, zero } from '../numbers/fraction.js'

/** One rate or probability of a chain, exactly. */
export interface ExactArc {
  readonly from: number
  readonly to: number
  readonly rate: Fraction
}

/** Largest chain that is solved in fractions by default: the digits of the fractions grow with the states. */
export const largestRational = 300

/**
 * Stationary distribution of an irreducible chain in exact fractions, by Gaussian elimination on integers without
 * fractions in between (Bareiss 1968, from memory). Slow and simple on purpose; shares no code with the elimination in
 * doubles.
 *
 * @param arcs rates, or probabilities of one step; staying is ignored, parallel arcs add up
 * @returns shares, length n, summing to 1
 * @throws RangeError where the chain is not irreducible
 * @cost n³/3 operations on integers of up to n times the digits of the rates
 */
export function solveRationally(n: number, arcs: readonly ExactArc[]): Fraction[] {
  if (n === 1) return [{ numerator: 1n, denominator: 1n }]
  // Balance of states 0 … n - 2 with the last share set to 1: Σ_{j < n-1} x_j q_ji = -q_{n-1,i}. Integers a row.
  const unknowns = n - 1
  const generator: Fraction[][] = Array.from({ length: n }, () => new Array<Fraction>(n).fill(zero))
  for (const { from, to, rate } of arcs) {
    if (from === to) continue
    generator[from][to] = add(generator[from][to], rate)
    generator[from][from] = subtract(generator[from][from], rate)
  }
  const rows = Array.from({ length: unknowns }, (_, i) => integersOf(generator.map((row) => row[i])))
  let previous = 1n
  for (let k = 0; k < unknowns; k++) {
    const pivotRow = rows.findIndex((row, i) => i >= k && row[k] !== 0n)
    if (pivotRow < 0) throw new RangeError('the chain is not irreducible')
    if (pivotRow !== k) [rows[k], rows[pivotRow]] = [rows[pivotRow], rows[k]]
    const pivot = rows[k][k]
    for (let i = k + 1; i < unknowns; i++) {
      const factor = rows[i][k]
      for (let j = k + 1; j < n; j++) rows[i][j] = (rows[i][j] * pivot - factor * rows[k][j]) / previous
      rows[i][k] = 0n
    }
    previous = pivot
  }
  // Back substitution over one denominator, the determinant, so that no fraction is needed until the end.
  const determinant = previous
  const top = new Array<bigint>(n)
  top[n - 1] = determinant
  for (let k = unknowns - 1; k >= 0; k--) {
    let sum = 0n
    for (let j = k + 1; j < n; j++) sum -= rows[k][j] * top[j]
    top[k] = sum / rows[k][k]
  }
  const total = top.reduce((sum, each) => sum + each, 0n)
  const shares = top.map((each) => divide({ numerator: each, denominator: 1n }, { numerator: total, denominator: 1n }))
  if (shares.some((each) => sign(each) <= 0)) throw new RangeError('the chain is not irreducible')
  return shares
}

/** The row times the least common denominator. */
function integersOf(row: readonly Fraction[]): bigint[] {
  let common = 1n
  for (const { denominator } of row) common = (common / greatestCommonDivisor(common, denominator)) * denominator
  return row.map(({ numerator, denominator }) => numerator * (common / denominator))
}

function greatestCommonDivisor(a: bigint, b: bigint): bigint {
  let x = a
  let y = b
  while (y !== 0n) [x, y] = [y, x % y]
  return x
}

/** Σ shares·values exactly. */
export const exactMean = (shares: readonly Fraction[], values: readonly Fraction[]): Fraction =>
  shares.reduce((sum, share, i) => add(sum, multiply(share, values[i])), zero)
