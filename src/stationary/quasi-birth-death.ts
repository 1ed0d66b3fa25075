import { planElimination, type SparseRates } from '../chain/elimination-plan.js'
import { reduceStates, rewardUntilRoot, stationaryVector } from '../chain/state-reduction.js'
import { compensatedSum } from '../numbers/compensated-sum.js'
import type { LevelStructure, RateArc } from '../recurrence/classification.js'
import { firstPassageDown, multiply } from './cyclic-reduction.js'
import { type Factors, factorise, solveFromLeftInPlace, solveInPlace } from './cyclic-reduction-elimination.js'

/**
 * A quasi-birth-death process in matrix-geometric form. Level k has the shares π_k = π_{k-1} R with
 * R = up (-U)^-1 and U = local + up G: the process watched in one level, while it is not below it (Neuts 1981, Latouche and
 * Ramaswami 1999, from memory). The boundary and level 0, watched on their own, are a finite chain.
 */
export interface QuasiBirthDeath {
  readonly structure: LevelStructure
  /** G, m×m row-major: phase in which the level below is entered first. */
  readonly passage: Float64Array
  /** up · G: rates at which a level is left upwards, to where it is met again. */
  readonly excursion: Float64Array
  /** Of -U. */
  readonly within: Factors
  /** Shares of the boundary states and of level 0, in proportion. */
  readonly lowest: Float64Array
  /** x on the boundary and level 0 that gains `reward` per time unit until some state of them, 0 there. */
  readonly rewardOfLowest: (reward: Float64Array) => Float64Array
}

/** The states have no coordinates to cut by. */
const nowhere = { values: new Int32Array(0), width: 0 }

export function quasiBirthDeath(structure: LevelStructure): QuasiBirthDeath {
  const m = structure.phases.length
  const up = structure.up.value
  const local = structure.local.value
  const down = structure.down.value
  const passage = firstPassageDown({ size: m, up, local, down })
  const excursion = multiply(up, passage, m)
  const beside = local.slice()
  const downward = new Float64Array(m)
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < m; j++) {
      beside[i * m + j] = i === j ? 0 : local[i * m + j] + excursion[i * m + j]
      downward[i] += down[i * m + j]
    }
  }
  const rates = lowestRates(structure, beside)
  let reduction = reduceStates(rates, planElimination(rates, nowhere))
  let lowest = stationaryVector(reduction)
  let heaviest = 0
  for (let k = 1; k < lowest.length; k++) if (lowest[k] > lowest[heaviest]) heaviest = k
  // Times to a rare state would be long, and the bounds made from them poor.
  if (lowest[reduction.root] < 0.01 * lowest[heaviest]) {
    reduction = reduceStates(rates, planElimination(rates, nowhere, heaviest))
    lowest = stationaryVector(reduction)
  }
  return {
    structure,
    passage,
    excursion,
    within: factorise(beside, downward, m),
    lowest,
    rewardOfLowest: (reward) => rewardUntilRoot(reduction, reward),
  }
}

/** Shares of the boundary and of the levels 0 … `levels` - 1, in that order, summing to 1. */
export function levelShares({ structure, within, lowest }: QuasiBirthDeath, levels: number): Float64Array {
  const m = structure.phases.length
  const b = structure.boundary.length
  const share = new Float64Array(b + levels * m)
  share.set(lowest)
  const next = new Float64Array(m)
  for (let level = 1; level < levels; level++) {
    const from = b + (level - 1) * m
    times(share.subarray(from, from + m), structure.up.value, next)
    solveFromLeftInPlace(within, next)
    share.set(next, from + m)
  }
  const total = compensatedSum(share)
  for (let k = 0; k < share.length; k++) share[k] /= total
  return share
}

/**
 * What is gained until some low state, from every state of the boundary and of the levels 0 … `levels` - 1: x with
 * Σ_j q_ij (x_i - x_j) = reward_i but for one state where x = 0, above the last level nothing is gained.
 *
 * From the top: y_k = (-U)^-1 (reward_k + up y_{k+1}) is gained until the level below is entered; then x_k = y_k + G x_{k-1}.
 */
export function rewardOfLevels(solved: QuasiBirthDeath, reward: Float64Array, levels: number): Float64Array {
  const { structure, passage, within } = solved
  const m = structure.phases.length
  const b = structure.boundary.length
  const up = structure.up.value
  const x = reward.slice()
  for (let level = levels - 1; level >= 1; level--) {
    const at = b + level * m
    const own = x.subarray(at, at + m)
    solveInPlace(within, own)
    addProduct(up, own, x.subarray(at - m, at))
  }
  x.set(solved.rewardOfLowest(x.slice(0, b + m)))
  for (let level = 1; level < levels; level++) {
    const at = b + level * m
    addProduct(passage, x.subarray(at - m, at), x.subarray(at, at + m))
  }
  return x
}

/** target = row · matrix. */
function times(row: Float64Array, matrix: Float64Array, target: Float64Array): void {
  const m = row.length
  target.fill(0)
  for (let i = 0; i < m; i++) {
    const each = row[i]
    if (each !== 0) for (let j = 0, at = i * m; j < m; j++) target[j] += each * matrix[at + j]
  }
}

/** target += matrix · column. */
function addProduct(matrix: Float64Array, column: Float64Array, target: Float64Array): void {
  const m = column.length
  for (let i = 0; i < m; i++) {
    let sum = 0
    for (let j = 0, at = i * m; j < m; j++) sum += matrix[at + j] * column[j]
    target[i] += sum
  }
}

/** The boundary and level 0 as a chain of their own: what lies above level 0 is passed over at once. */
function lowestRates(structure: LevelStructure, beside: Float64Array): SparseRates {
  const b = structure.boundary.length
  const m = structure.phases.length
  const size = b + m
  const rows: Map<number, number>[] = Array.from({ length: size }, () => new Map())
  const put = (arcs: readonly RateArc[], fromOffset: number, toOffset: number) => {
    for (const { from, to, value } of arcs) {
      const row = rows[from + fromOffset]
      row.set(to + toOffset, (row.get(to + toOffset) ?? 0) + value)
    }
  }
  put(structure.insideBoundary, 0, 0)
  put(structure.boundaryUp, 0, b)
  put(structure.boundaryDown, b, 0)
  for (let i = 0; i < m; i++) {
    for (let j = 0; j < m; j++) if (beside[i * m + j] > 0) rows[b + i].set(b + j, beside[i * m + j])
  }
  const rowStart = new Int32Array(size + 1)
  const target: number[] = []
  const rate: number[] = []
  rows.forEach((row, i) => {
    for (const [to, value] of [...row].sort((p, q) => p[0] - q[0])) {
      target.push(to)
      rate.push(value)
    }
    rowStart[i + 1] = target.length
  })
  return { rowStart, target: Int32Array.from(target), rate: Float64Array.from(rate) }
}
