import { periodOf } from '../chain/period.js'
import { strongComponents } from '../chain/strong-components.js'
import { compressed, type Exploration } from './exploration.js'

/** Communicating classes of the states listed, in the arcs listed. */
export interface ListedClasses {
  readonly componentOf: Int32Array
  readonly count: number
}

export function listedClasses(heads: readonly (readonly number[])[]): ListedClasses {
  const { rowStart, target } = compressed(heads)
  return strongComponents(rowStart, target)
}

/**
 * Period of a set of communicating states by the arcs within it, with the label (modulo the period) of each: along
 * every arc it rises by one. A loop makes the period 1.
 */
export function periodWithin(
  exploration: Exploration,
  members: readonly number[],
): { readonly period: number; readonly labelOf: ReadonlyMap<number, number> } {
  const position = new Map(members.map((state, k) => [state, k] as const))
  const heads = members.map((state, k) => {
    const own = exploration.heads[state].flatMap((head) => position.get(head) ?? [])
    return exploration.stays[state] ? [...own, k] : own
  })
  const { rowStart, target } = compressed(heads)
  const levels = new Int32Array(members.length)
  const period = periodOf(rowStart, target, Int32Array.from(members.keys()), levels)
  return {
    period,
    labelOf: new Map(members.map((state, k) => [state, period === 0 ? 0 : levels[k] % period] as const)),
  }
}
