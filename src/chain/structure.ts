import { absorptionFrom } from './absorption.js'
import type { Chain, ClosedClass, JoinedArcs, Structure } from './chain.js'
import { periodOf } from './period.js'
import { strongComponents } from './strong-components.js'

/**
 * Closed classes with their periods, transient states, and where the chain ends from its start. Closed classes come in
 * the order of their first states. Every declared state of a table counts, reachable or not.
 *
 * @param joined `joinArcs(chain)`
 * @cost linear in states and arcs, but for absorption: an elimination over the transient states that the start reaches
 */
export function structureOf(chain: Chain, joined: JoinedArcs): Structure {
  const { size } = chain
  const { rowStart, target } = joined
  const { count, componentOf } = strongComponents(rowStart, target)
  const closed = new Uint8Array(count).fill(1)
  for (let state = 0; state < size; state++) {
    const own = componentOf[state]
    for (let arc = rowStart[state]; arc < rowStart[state + 1]; arc++) {
      if (componentOf[target[arc]] !== own) closed[own] = 0
    }
  }
  const classOfComponent = new Int32Array(count).fill(-1)
  const classOf = new Int32Array(size)
  const sizes: number[] = []
  let transient = 0
  for (let state = 0; state < size; state++) {
    const component = componentOf[state]
    if (closed[component] === 0) {
      classOf[state] = -1
      transient++
      continue
    }
    if (classOfComponent[component] === -1) {
      classOfComponent[component] = sizes.length
      sizes.push(0)
    }
    classOf[state] = classOfComponent[component]
    sizes[classOf[state]]++
  }
  const transientStates = new Int32Array(transient)
  const members = sizes.map((each) => new Int32Array(each))
  const filled = new Int32Array(sizes.length)
  let filledTransient = 0
  for (let state = 0; state < size; state++) {
    const own = classOf[state]
    if (own < 0) transientStates[filledTransient++] = state
    else members[own][filled[own]++] = state
  }
  const level = new Int32Array(size)
  const absorption = absorptionFrom(chain.start, joined, classOf, sizes.length, chain)
  const closedClasses: ClosedClass[] = members.map((states, each) => ({
    states,
    period: chain.time === 'continuous' ? 1 : periodOf(rowStart, target, states, level),
    reachedWith: absorption.reachedWith[each],
    reachedWithError: absorption.reachedWithError[each],
  }))
  return { classOf, closedClasses, transientStates, transitions: target.length, meanTimeToSettle: absorption.meanTime }
}
