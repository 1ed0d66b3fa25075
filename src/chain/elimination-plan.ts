import { dissect } from './nested-dissection.js'

/** Rates of a chain in compressed rows: what leaves state i stands at rowStart[i] … rowStart[i + 1] - 1; staying is ignored. */
export interface SparseRates {
  /** Length n + 1. */
  readonly rowStart: Int32Array
  readonly target: Int32Array
  /** Positive. */
  readonly rate: Float64Array
}

/**
 * In which order the states are eliminated, in groups ("fronts") that are dense matrices, and what that costs.
 * A front holds its own states and the boundary: the later states that they are coupled with by then.
 */
export interface EliminationPlan {
  readonly fronts: number
  /** States in order of elimination, length n. */
  readonly order: Int32Array
  /** States of front t are order[pivotStart[t]] … order[pivotStart[t + 1] - 1]; a front comes after its children. */
  readonly pivotStart: Int32Array
  /** -1 for the last front. */
  readonly parent: Int32Array
  readonly boundaryStart: Int32Array
  /** Positions in `order`, ascending in each front. */
  readonly boundary: Int32Array
  /** Multiplications with addition. */
  readonly operations: number
  /** Largest memory of factors and fronts at one time. */
  readonly bytes: number
}

/** Some minutes of work; what needs more is not begun. */
export const bearableOperations = 4e11

/**
 * The plan of a sparse elimination: everything that can be known before any rate is touched.
 *
 * Sources: nested dissection, George 1973; fronts, Duff and Reid 1983 (from memory).
 *
 * @param coordinates n × width, row-major: where each state lies, for cuts through the middle; empty where not known
 * @param mostOperations where more turn out to be needed, planning stops: `operations` is then Infinity and the plan can't
 *   be carried out
 * @param last a state that must not be eliminated before all others of its front, kept in the last front
 */
export function planElimination(
  rates: SparseRates,
  coordinates: { readonly values: Int32Array; readonly width: number },
  last?: number,
  mostOperations = bearableOperations,
): EliminationPlan {
  const n = rates.rowStart.length - 1
  const pattern = symmetricPattern(rates)
  const { order, pivotStart, parent } = dissect(pattern.start, pattern.neighbour, coordinates, last)
  const fronts = parent.length
  const positionOf = new Int32Array(n)
  for (let k = 0; k < n; k++) positionOf[order[k]] = k

  const boundaries: Int32Array[] = []
  const children: number[][] = Array.from({ length: fronts }, () => [])
  const seen = new Int32Array(n).fill(-1)
  const boundaryStart = new Int32Array(fronts + 1)
  let operations = 0
  let factorBytes = 0
  let waiting = 0 // bytes of updates that no parent has taken up yet
  let peak = 0
  for (let t = 0; t < fronts; t++) {
    const end = pivotStart[t + 1]
    const found: number[] = []
    const note = (position: number) => {
      if (position >= end && seen[position] !== t) {
        seen[position] = t
        found.push(position)
      }
    }
    for (let k = pivotStart[t]; k < end; k++) {
      const state = order[k]
      for (let arc = pattern.start[state]; arc < pattern.start[state + 1]; arc++)
        note(positionOf[pattern.neighbour[arc]])
    }
    let taken = 0
    for (const child of children[t]) {
      for (const position of boundaries[child]) note(position)
      taken += 8 * boundaries[child].length ** 2
    }
    const boundary = Int32Array.from(found).sort()
    boundaries.push(boundary)
    boundaryStart[t + 1] = boundaryStart[t] + boundary.length
    if (parent[t] >= 0) children[parent[t]].push(t)
    const pivots = end - pivotStart[t]
    const size = pivots + boundary.length
    operations += eliminationOperations(size, pivots)
    if (operations > mostOperations) {
      operations = Number.POSITIVE_INFINITY
      peak = Number.POSITIVE_INFINITY
      break
    }
    peak = Math.max(peak, factorBytes + waiting + 8 * size * size + 16 * pivots * size)
    factorBytes += 16 * pivots * size
    waiting += 8 * boundary.length ** 2 - taken
  }
  const boundary = new Int32Array(boundaryStart[boundaries.length])
  for (let t = 0; t < boundaries.length; t++) boundary.set(boundaries[t], boundaryStart[t])
  return { fronts, order, pivotStart, parent, boundaryStart, boundary, operations, bytes: peak }
}

/** Σ of squares of what is left after each pivot. */
const eliminationOperations = (size: number, pivots: number): number => {
  const squares = (m: number) => (m * (m + 1) * (2 * m + 1)) / 6
  return squares(size - 1) - squares(Math.max(size - pivots - 1, 0))
}

/** Neighbours in either direction, without the state itself; a pair with arcs both ways may stand twice. */
function symmetricPattern({ rowStart, target }: SparseRates): { start: Int32Array; neighbour: Int32Array } {
  const n = rowStart.length - 1
  const start = new Int32Array(n + 1)
  for (let i = 0; i < n; i++) {
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      if (target[arc] === i) continue
      start[i + 1]++
      start[target[arc] + 1]++
    }
  }
  for (let i = 0; i < n; i++) start[i + 1] += start[i]
  const next = start.slice(0, n)
  const neighbour = new Int32Array(start[n])
  for (let i = 0; i < n; i++) {
    for (let arc = rowStart[i]; arc < rowStart[i + 1]; arc++) {
      const j = target[arc]
      if (j === i) continue
      neighbour[next[i]++] = j
      neighbour[next[j]++] = i
    }
  }
  return { start, neighbour }
}
