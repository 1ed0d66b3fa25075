import type { VariablesModel } from '../model/model.js'
import { countOf, type Ground } from './end-pattern.js'
import { keyOf } from './exploration.js'
import { listedClasses, periodWithin } from './period-of-class.js'

/** The one infinite closed class, as far as it is listed. */
export interface InfiniteClass {
  /** Indices of listed states of it: all those well below the tops. */
  readonly members: ReadonlySet<number>
  readonly period: number | null
}

/**
 * The infinite closed class within a closed set of states, where the listing shows it: a communicating class of the
 * listed states that nothing leaves but near the top.
 *
 * @param bottom indices of listed states
 */
export function infiniteClass(
  model: VariablesModel,
  ground: Ground,
  bottom: readonly number[],
): InfiniteClass | undefined {
  const { exploration, ends } = ground
  const { componentOf } = listedClasses(exploration.heads)
  const sizes = new Map<number, number>()
  for (const k of bottom) sizes.set(componentOf[k], (sizes.get(componentOf[k]) ?? 0) + 1)
  const [largest] = [...sizes].sort((a, b) => b[1] - a[1])[0] ?? []
  if (largest === undefined) return undefined
  const members = [...exploration.states.keys()].filter((k) => componentOf[k] === largest)
  if (members.length < 2) return undefined
  const own = new Set(members)
  // Nothing may lead out of it but near the top, where the listing ends; and it has to go on to the top on some end.
  const nearTop = (k: number): boolean =>
    ends.some(({ end, top, window }) => countOf(end, exploration.states[k]) > top - 2 * window)
  const leaks = members.some(
    (k) => !nearTop(k) && exploration.heads[k].some((head) => !own.has(head) && !nearTop(head)),
  )
  // It spans the listing on some end: many classes, one behind the other, are no closed class.
  const climbs = ends.some(({ end, top, window }) => {
    const counts = members.map((k) => countOf(end, exploration.states[k]))
    return counts.some((count) => count > top - 3 * window) && counts.some((count) => count < end.level + window)
  })
  if (leaks || !climbs) return undefined
  return { members: own, period: model.time === 'continuous' ? 1 : endlessPeriod(ground, members) }
}

/**
 * The period of the listed part is a multiple of the whole class's. It is the same where the labels of its cyclic
 * classes go on beyond the listing: moved out by one window, a state's label changes by the same amount everywhere.
 */
function endlessPeriod({ exploration, ends }: Ground, members: readonly number[]): number | null {
  const { period, labelOf } = periodWithin(exploration, members)
  if (period === 1) return 1
  if (period === 0) return null
  for (const { end, window, top } of ends) {
    let change: number | undefined
    for (const k of members) {
      const state = exploration.states[k]
      const count = countOf(end, state)
      if (count < end.level || count > top - 2 * window) continue
      const further = [...state]
      further[end.element] += end.outward * window
      const label = labelOf.get(exploration.indexOf.get(keyOf(further)) ?? -1)
      if (label === undefined) continue
      const own = (((label - (labelOf.get(k) as number)) % period) + period) % period
      if (change === undefined) change = own
      else if (change !== own) return null
    }
  }
  return period
}
