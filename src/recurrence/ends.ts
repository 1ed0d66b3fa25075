import type { VariablesModel } from '../model/model.js'
import { type Copy, type FarMove, type FarMoves, movesAt, type Place } from './moves.js'
import { NotFollowed, type Rational } from './rational.js'
import { NeedsModulus } from './reading.js'

/** One end of a model with a single unbounded element: all that happens where its count is at least `level`. */
export interface End {
  readonly element: number
  /** The element is outward × count. */
  readonly outward: 1 | -1
  readonly modulus: number
  /** Smallest count from which on all moves of all phases are as read. */
  readonly level: number
  /** Values of the other elements, and the remainder of the count. Contains every phase that is met far out. */
  readonly phases: readonly Place[]
  /** As read, one a phase, for probing. */
  readonly far: readonly FarMoves[]
  /** Arcs out of each phase; `to` undefined where the move resets the count to a value. */
  readonly arcs: readonly (readonly EndArc[])[]
}

export interface EndArc {
  readonly to: number | undefined
  /** Gain of the count. */
  readonly jump: number
  readonly rate: Rational
  readonly label: number
}

/** Phases that are followed, and remainders that are told apart. */
const mostPhases = 3000
const largestModulus = 720

/**
 * Reads an end: the phases that `seeds` lead to, moves being followed wherever the count is large.
 * @param seeds state vectors
 * @throws NotFollowed
 */
export function readEnd(
  model: VariablesModel,
  copies: readonly Copy[],
  element: number,
  outward: 1 | -1,
  seeds: readonly (readonly number[])[],
): End {
  let modulus = 1
  for (;;) {
    try {
      return closure(model, copies, element, outward, seeds, modulus)
    } catch (error) {
      if (!(error instanceof NeedsModulus)) throw error
      const next = leastCommonMultiple(modulus, Number(error.modulus))
      if (next === modulus || next > largestModulus) {
        throw new NotFollowed('the moves depend on the remainder of an unbounded variable in too many ways')
      }
      modulus = next
    }
  }
}

function closure(
  model: VariablesModel,
  copies: readonly Copy[],
  element: number,
  outward: 1 | -1,
  seeds: readonly (readonly number[])[],
  modulus: number,
): End {
  const phases: Place[] = []
  const indexOf = new Map<string, number>()
  const phaseOf = (values: readonly number[], residue: number): number => {
    const own = values.map((value, k) => (k === element ? 0 : value))
    const key = `${own.join(' ')}|${residue}`
    const known = indexOf.get(key)
    if (known !== undefined) return known
    if (phases.length >= mostPhases)
      throw new NotFollowed(`there are more than ${mostPhases} phases beside the unbounded variable`)
    indexOf.set(key, phases.length)
    phases.push({ counts: [element], outward: [outward], values: own, modulus, residue })
    return phases.length - 1
  }
  for (const seed of seeds) phaseOf(seed, remainder(seed[element] * outward, modulus))
  const far: FarMoves[] = []
  const arcs: EndArc[][] = []
  let level = 0
  for (let k = 0; k < phases.length; k++) {
    const read = movesAt(model, copies, phases[k])
    far.push(read)
    level = Math.max(level, read.level)
    arcs.push(
      read.moves.map(({ jump, rate, values, label }: FarMove) =>
        jump === undefined
          ? { to: undefined, jump: 0, rate, label }
          : { to: phaseOf(values, remainder(phases[k].residue + jump[0], modulus)), jump: jump[0], rate, label },
      ),
    )
  }
  return { element, outward, modulus, level, phases, far, arcs }
}

export const remainder = (value: number, modulus: number): number => ((value % modulus) + modulus) % modulus

const leastCommonMultiple = (a: number, b: number): number => (a / commonDivisor(a, b)) * b

export function commonDivisor(a: number, b: number): number {
  let [x, y] = [Math.abs(a), Math.abs(b)]
  while (y !== 0) [x, y] = [y, x % y]
  return x
}

/** Phase of a state that lies on this end. */
export function phaseIndex(end: End): (state: readonly number[]) => number | undefined {
  const indexOf = new Map(end.phases.map((phase, k) => [`${phase.values.join(' ')}|${phase.residue}`, k] as const))
  return (state) => {
    const own = state.map((value, k) => (k === end.element ? 0 : value))
    return indexOf.get(`${own.join(' ')}|${remainder(state[end.element] * end.outward, end.modulus)}`)
  }
}
