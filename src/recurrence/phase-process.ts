import { add, divide, type Fraction, fraction, multiply, subtract, toNumber, zero } from '../numbers/fraction.js'

/** Arcs of a finite process with exact positive rates: row i holds what leaves phase i. Loops (to = i) count for jumps only. */
export type PhaseArcs = readonly (readonly { readonly to: number; readonly jump: number; readonly rate: Fraction }[])[]

/** Phases up to which everything is done in fractions, and up to which a sign is decided in them where doubles can't. */
export const exactPhases = 40
export const mostExactPhases = 120

/**
 * Stationary shares of an irreducible finite process, exactly: state reduction (Grassmann, Taksar and Heyman 1985).
 * @cost n³/3 operations on fractions that grow with n
 */
export function exactShares(arcs: PhaseArcs): Fraction[] {
  const n = arcs.length
  const rate = Array.from({ length: n }, () => new Array<Fraction>(n).fill(zero))
  arcs.forEach((row, i) => {
    for (const { to, rate: own } of row) if (to !== i) rate[i][to] = add(rate[i][to], own)
  })
  for (let last = n - 1; last > 0; last--) {
    let leaving = zero
    for (let j = 0; j < last; j++) leaving = add(leaving, rate[last][j])
    for (let i = 0; i < last; i++) {
      if (rate[i][last].numerator === 0n) continue
      const share = divide(rate[i][last], leaving)
      rate[i][last] = share
      for (let j = 0; j < last; j++) {
        if (rate[last][j].numerator !== 0n) rate[i][j] = add(rate[i][j], multiply(share, rate[last][j]))
      }
    }
  }
  const weight = [fraction(1)]
  let total = fraction(1)
  for (let k = 1; k < n; k++) {
    let own = zero
    for (let i = 0; i < k; i++) own = add(own, multiply(weight[i], rate[i][k]))
    weight.push(own)
    total = add(total, own)
  }
  return weight.map((each) => divide(each, total))
}

/**
 * The same in doubles, every share within a relative error of `relativeError` (O'Cinneide 1993: below 2n³ units of
 * rounding, from memory; here with a factor to spare and the rounding of the rates).
 */
export function doubleShares(arcs: PhaseArcs): { readonly shares: Float64Array; readonly relativeError: number } {
  const n = arcs.length
  const rate = new Float64Array(n * n)
  arcs.forEach((row, i) => {
    for (const { to, rate: own } of row) if (to !== i) rate[i * n + to] += toNumber(own)
  })
  for (let last = n - 1; last > 0; last--) {
    let leaving = 0
    for (let j = 0; j < last; j++) leaving += rate[last * n + j]
    for (let i = 0; i < last; i++) {
      if (rate[i * n + last] === 0) continue
      const share = rate[i * n + last] / leaving
      rate[i * n + last] = share
      for (let j = 0; j < last; j++) rate[i * n + j] += share * rate[last * n + j]
    }
  }
  const shares = new Float64Array(n)
  shares[0] = 1
  let total = 1
  for (let k = 1; k < n; k++) {
    for (let i = 0; i < k; i++) shares[k] += shares[i] * rate[i * n + k]
    total += shares[k]
  }
  for (let k = 0; k < n; k++) shares[k] /= total
  return { shares, relativeError: (4 * n ** 3 + 16 * n + 64) * Number.EPSILON }
}

/** Drift of each phase: Σ rate × jump. */
export const driftOf = (row: PhaseArcs[number]): Fraction =>
  row.reduce((sum, { rate, jump }) => add(sum, multiply(rate, fraction(jump))), zero)

/**
 * Solution of Σ_j rate_ij (g_j - g_i) = mean - driftOf(i), g₀ = 0: level + g(phase) then has the same drift in every phase.
 * The process must have one closed class.
 */
export function correctors(arcs: PhaseArcs, mean: Fraction): Fraction[] {
  const n = arcs.length
  // Unknowns g₁ …; the equation of one phase of the closed class is implied by the others, so a full sweep with pivots is used.
  const rows = arcs.map((row, i) => {
    const line = new Array<Fraction>(n + 1).fill(zero)
    for (const { to, rate } of row) {
      if (to === i) continue
      line[to] = add(line[to], rate)
      line[i] = subtract(line[i], rate)
    }
    line[n] = subtract(mean, driftOf(row))
    return line
  })
  const pivotOf = new Array<number>(n).fill(-1)
  let used = 0
  for (let column = 1; column < n; column++) {
    const pivot = rows.findIndex((line, k) => k >= used && line[column].numerator !== 0n)
    if (pivot === -1) continue
    ;[rows[used], rows[pivot]] = [rows[pivot], rows[used]]
    const lead = rows[used][column]
    rows[used] = rows[used].map((each) => (each.numerator === 0n ? each : divide(each, lead)))
    for (let k = 0; k < n; k++) {
      const factor = rows[k][column]
      if (k === used || factor.numerator === 0n) continue
      rows[k] = rows[k].map((each, j) =>
        rows[used][j].numerator === 0n ? each : subtract(each, multiply(factor, rows[used][j])),
      )
    }
    pivotOf[column] = used++
  }
  return pivotOf.map((row) => (row === -1 ? zero : rows[row][n]))
}

/**
 * Potentials g with jump = g(i) - g(to) on every arc, if there are any: then the level can't leave a finite range.
 * The process must be irreducible.
 */
export function staysInRange(arcs: PhaseArcs): boolean {
  const potential = new Map([[0, 0]])
  const queue = [0]
  for (const phase of queue) {
    const own = potential.get(phase) as number
    for (const { to, jump } of arcs[phase]) {
      const known = potential.get(to)
      if (known === undefined) {
        potential.set(to, own - jump)
        queue.push(to)
      } else if (known !== own - jump) return false
    }
  }
  return true
}

/** Long-run variance of the level per time unit, around a mean drift of 0, by the correctors. */
export function levelVariance(arcs: PhaseArcs, shares: readonly Fraction[], corrector: readonly Fraction[]): Fraction {
  let total = zero
  arcs.forEach((row, i) => {
    for (const { to, jump, rate } of row) {
      const step = add(fraction(jump), subtract(corrector[to], corrector[i]))
      total = add(total, multiply(multiply(shares[i], rate), multiply(step, step)))
    }
  })
  return total
}
