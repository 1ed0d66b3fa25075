import type { VariablesModel } from '../model/model.js'
import { add, type Fraction, fraction, multiply, sign, toNumber, zero } from '../numbers/fraction.js'
import type { Classification, LatticeMove, Prediction } from './classification.js'
import { agreesAt, type Copy, movesAt, type Place } from './moves.js'
import { constantIn, NotFollowed } from './rational.js'

/**
 * A walk that moves in the same way everywhere on Z^d: nothing depends on where it is.
 *
 * Sources: Pólya 1921; Chung and Fuchs 1951 (bounded jumps with mean 0 are recurrent in one and two dimensions, and
 * transient where they span three or more; any other mean is transient by the law of large numbers). A recurrent walk
 * has the counting measure as its invariant measure, which is infinite: null recurrent. From memory.
 *
 * @returns undefined where the model is no such walk
 * @throws NotFollowed
 */
export function classifyWalk(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly number[],
): Classification | undefined {
  const place: Place = {
    counts: elements,
    outward: elements.map(() => 1 as const),
    values: Array.from(model.start),
    modulus: 1,
    residue: 0,
  }
  const far = movesAt(model, copies, place)
  if (far.level !== Number.NEGATIVE_INFINITY) return undefined
  const start = place.values.map((value, k) => (elements.includes(k) ? 0 : value))
  const moves: LatticeMove[] = []
  for (const { jump, rate, values } of far.moves) {
    const constant = constantIn(rate)
    if (jump === undefined || constant === undefined || values.some((value, k) => value !== start[k])) return undefined
    moves.push({ jump, rate: constant })
  }
  if (moves.length === 0) return undefined
  const from = elements.map((element) => model.start[element])
  for (const away of [0, 1, 2, 17, 1003]) {
    for (const signs of [1, -1]) {
      const counts = from.map((value, k) =>
        Number.isFinite(signs > 0 ? model.upper[elements[k]] : model.lower[elements[k]])
          ? value
          : value + signs * away * (k + 1),
      )
      if (!agreesAt(model, place, far, counts)) throw new NotFollowed('the moves are not exactly those that were read')
    }
  }
  const mean = elements.map((_, k) => meanOf(moves, k))
  const balanced = mean.every((each) => each.numerator === 0n)
  const dimension = rank(moves.map(({ jump }) => jump))
  const names = elements.map((element) => model.elements[element])
  const recurrent = balanced && dimension <= 2
  const staying = model.time === 'discrete' && staysPut(moves)
  const growth = balanced ? returnsOf(moves, dimension, elements.length) : speeds(names, mean)
  return {
    recurrence: recurrent ? 'null recurrent' : 'transient',
    grade: 'proved',
    basis: balanced
      ? `a walk that moves in the same way everywhere, with mean drift exactly 0, in ${dimension} ${dimension === 1 ? 'dimension' : 'dimensions'} (Pólya 1921, Chung and Fuchs 1951)`
      : 'a walk that moves in the same way everywhere, with a mean drift that is not 0 (the law of large numbers; Chung and Fuchs 1951)',
    theorem: balanced ? 'Pólya 1921, Chung and Fuchs 1951' : 'Chung and Fuchs 1951',
    checked: [
      'no guard, rate or jump depends on the unbounded variables',
      'the jumps are bounded',
      `the jumps span ${dimension} ${dimension === 1 ? 'dimension' : 'dimensions'}`,
      balanced ? 'the mean drift is exactly 0' : 'the mean drift is not 0',
    ],
    closedClasses: balanced
      ? [{ size: null, period: model.time === 'continuous' || staying ? 1 : periodOf(moves) }]
      : [],
    drift: names.map((of, k) => ({ of, where: 'everywhere', value: toNumber(mean[k]), exact: mean[k] })),
    ...(growth.length > 0 ? { growth } : {}),
    structure: { form: 'walk', time: model.time, elements, moves },
    remedies: [],
  }
}

const meanOf = (moves: readonly LatticeMove[], k: number): Fraction =>
  moves.reduce((sum, { jump, rate }) => add(sum, multiply(rate, fraction(jump[k]))), zero)

const speeds = (names: readonly string[], mean: readonly Fraction[]): Prediction[] =>
  names.map((name, k) => ({
    name: `speed_${name}`,
    value: toNumber(mean[k]),
    exact: mean[k],
    means: `limit of ${name}(t) / t`,
    source: 'the law of large numbers',
  }))

/** Moves that change the state have a total probability below 1. */
const staysPut = (moves: readonly LatticeMove[]): boolean => {
  const total = moves.reduce((sum, { rate }) => add(sum, rate), zero)
  return total.numerator < total.denominator
}

/** Dimension of the space that the jumps span. */
export function rank(vectors: readonly (readonly number[])[]): number {
  const rows = vectors.map((each) => each.map(BigInt))
  let used = 0
  for (let column = 0; column < (rows[0]?.length ?? 0); column++) {
    const pivot = rows.findIndex((row, k) => k >= used && row[column] !== 0n)
    if (pivot === -1) continue
    ;[rows[used], rows[pivot]] = [rows[pivot], rows[used]]
    for (let k = used + 1; k < rows.length; k++) {
      const factor = rows[k][column]
      if (factor !== 0n) rows[k] = rows[k].map((each, j) => each * rows[used][column] - factor * rows[used][j])
    }
    used++
  }
  return used
}

/**
 * Period of a walk with mean 0: the smallest k for which k jumps of the first kind are a sum of differences of jumps.
 * The differences span a lattice, brought to triangular form by Euclid's algorithm.
 */
function periodOf(moves: readonly LatticeMove[]): number | null {
  const [first, ...others] = moves.map(({ jump }) => jump)
  const lattice = triangular(others.map((jump) => jump.map((each, k) => each - first[k])))
  for (let k = 1; k <= 1000; k++)
    if (
      contains(
        lattice,
        first.map((each) => each * k),
      )
    )
      return k
  return null
}

function triangular(vectors: readonly (readonly number[])[]): number[][] {
  let rest = vectors.map((each) => [...each])
  const rows: number[][] = []
  for (let column = 0; column < (vectors[0]?.length ?? 0); column++) {
    for (;;) {
      const candidates = rest
        .filter((row) => row[column] !== 0)
        .sort((a, b) => Math.abs(a[column]) - Math.abs(b[column]))
      if (candidates.length === 0) break
      const [pivot] = candidates
      if (candidates.length === 1) {
        rows.push(pivot)
        rest = rest.filter((row) => row !== pivot)
        break
      }
      for (const row of candidates.slice(1)) {
        const times = Math.trunc(row[column] / pivot[column])
        for (let j = 0; j < row.length; j++) row[j] -= times * pivot[j]
      }
    }
  }
  return rows
}

function contains(lattice: readonly (readonly number[])[], vector: readonly number[]): boolean {
  const rest = [...vector]
  for (const row of lattice) {
    const column = row.findIndex((each) => each !== 0)
    if (rest[column] % row[column] !== 0) return false
    const times = rest[column] / row[column]
    for (let j = 0; j < rest.length; j++) rest[j] -= times * row[j]
  }
  return rest.every((each) => each === 0)
}

/**
 * Expected returns of the simple symmetric walk in three or more dimensions: ∫₀^∞ (e^(-t/d) I₀(t/d))^d dt - 1
 * (Montroll 1956, from memory; in three dimensions Watson's integral). In continuous time every return counts once as well.
 */
function returnsOf(moves: readonly LatticeMove[], dimension: number, d: number): Prediction[] {
  const simple =
    dimension === d &&
    d >= 3 &&
    moves.length === 2 * d &&
    moves.every(({ jump, rate }) => {
      const steps = jump.filter((each) => each !== 0)
      return (
        steps.length === 1 && Math.abs(steps[0]) === 1 && sign(add(rate, multiply(moves[0].rate, fraction(-1)))) === 0
      )
    }) &&
    new Set(moves.map(({ jump }) => jump.join(' '))).size === 2 * d &&
    !staysPut(moves)
  if (!simple) return []
  // t = e^s: the integrand falls off exponentially on both sides, so the trapezoid rule converges faster than any power.
  const step = 1 / 32
  let total = 0
  for (let s = -45; s <= 90; s += step) {
    const t = Math.exp(s)
    total += t * scaledBessel(t / d) ** d
  }
  return [
    {
      name: 'returns',
      value: total * step - 1,
      means: 'expected number of returns to the start',
      source: 'Montroll 1956 (from memory)',
    },
  ]
}

/** e^(-x) I₀(x): the power series up to 30, the asymptotic one beyond (relative error below 1e-14). */
function scaledBessel(x: number): number {
  if (x <= 30) {
    let term = 1
    let sum = 1
    for (let k = 1; term > sum * 1e-18; k++) {
      term *= (x * x) / (4 * k * k)
      sum += term
    }
    return sum * Math.exp(-x)
  }
  let term = 1
  let sum = 1
  for (let k = 1; k < 40; k++) {
    const next = (term * (2 * k - 1) ** 2) / (8 * k * x)
    if (next >= term || next < 1e-18) break
    term = next
    sum += term
  }
  return sum / Math.sqrt(2 * Math.PI * x)
}
