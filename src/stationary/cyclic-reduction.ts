import { factorise, solveColumns } from './cyclic-reduction-elimination.js'

/** Matrices m×m, row-major, of a homogeneous part of a quasi-birth-death process: rates to the next, the same, the lower level. */
export interface LevelRates {
  readonly size: number
  readonly up: Float64Array
  /** The diagonal is not read. */
  readonly local: Float64Array
  readonly down: Float64Array
}

/** Each step doubles the number of levels that are followed: more than 2^60 of them means no steady state. */
const mostSteps = 60

/**
 * G: from phase i of a level, the probability that the level below is first entered in phase j.
 *
 * Logarithmic reduction. All its inverses are of I - U with rows whose excess is the row sum of H² + L², so they are made by
 * elimination with that excess in place of the diagonal (Grassmann, Taksar and Heyman 1985; Alfa, Xue and Ye 2002): nothing
 * is ever subtracted, and a load near 1 costs no digits.
 *
 * Source: Latouche and Ramaswami 1993.
 *
 * @returns m×m row-major, rows summing to 1 but for rounding where the process comes down with certainty
 */
export function firstPassageDown({ size: m, up, local, down }: LevelRates): Float64Array {
  let { left: high, right: low } = absorbed(local, up, down, m)
  const passage = low.slice()
  let climbed: Float64Array = high.slice()
  for (let step = 0; step < mostSteps; step++) {
    if (largestRowSum(climbed, m) < 2 ** -64) break
    const beside = multiply(high, low, m)
    const other = multiply(low, high, m)
    for (let k = 0; k < beside.length; k++) beside[k] += other[k]
    const next = absorbed(beside, multiply(high, high, m), multiply(low, low, m), m)
    high = next.left
    low = next.right
    const reached = multiply(climbed, low, m)
    for (let k = 0; k < passage.length; k++) passage[k] += reached[k]
    climbed = multiply(climbed, high, m)
  }
  return passage
}

/** Where one leaves for good, starting in each phase and moving by `beside` until then: to the left or to the right. */
function absorbed(beside: Float64Array, left: Float64Array, right: Float64Array, m: number) {
  const excess = new Float64Array(m)
  for (let i = 0; i < m; i++) for (let j = 0; j < m; j++) excess[i] += left[i * m + j] + right[i * m + j]
  const factors = factorise(beside, excess, m)
  return { left: solveColumns(factors, left), right: solveColumns(factors, right) }
}

/** Product of two m×m matrices, row-major. */
export function multiply(a: Float64Array, b: Float64Array, m: number): Float64Array {
  const product = new Float64Array(m * m)
  for (let i = 0; i < m; i++) {
    for (let k = 0; k < m; k++) {
      const factor = a[i * m + k]
      if (factor === 0) continue
      for (let j = 0, at = i * m, from = k * m; j < m; j++) product[at + j] += factor * b[from + j]
    }
  }
  return product
}

function largestRowSum(a: Float64Array, m: number): number {
  let largest = 0
  for (let i = 0; i < m; i++) {
    let sum = 0
    for (let j = 0; j < m; j++) sum += a[i * m + j]
    if (sum > largest) largest = sum
  }
  return largest
}
