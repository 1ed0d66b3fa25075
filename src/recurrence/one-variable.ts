import type { VariablesModel } from '../model/model.js'
import type { Classification, CountableClass, Drift } from './classification.js'
import { climbRoom, type EndClass } from './end-class.js'
import { countOf, type Ground, groundOf, type MetClass } from './end-pattern.js'
import { reaching } from './exploration.js'
import { growthOf } from './growth.js'
import { infiniteClass } from './infinite-class.js'
import { structureOfEnds } from './level-structure.js'
import type { Copy } from './moves.js'
import { listedClasses, periodWithin } from './period-of-class.js'

/** What is decided before periods, predictions and structures are added. */
interface Decision {
  readonly recurrence: Classification['recurrence']
  readonly grade: 'proved' | 'open'
  readonly says: string
  readonly noSteadyState?: boolean
}

/**
 * Class of a model with one unbounded element. From far out every class of phases comes back soon, late, or escapes;
 * below lie finitely many states, all listed, so the rest is a question of a finite graph.
 * @throws NotFollowed
 */
export function classifyOneVariable(
  model: VariablesModel,
  copies: readonly Copy[],
  element: number,
  directions: readonly (1 | -1)[],
): Classification {
  const ground = groundOf(model, copies, element, directions)
  const met = metClasses(ground)
  const graph = graphOf(ground, met)
  const decision = decide(ground, met, graph)
  const decisive = decisiveClasses(met, decision)
  const theorem = [...new Set(decisive.map(({ own }) => own.theorem).filter((each) => each !== ''))].join('; ')
  const explosive = decision.recurrence !== 'undetermined' && met.some(({ own }) => own.explosive === true)
  const endless = graph.bottoms.filter(({ beyond }) => beyond.length > 0)
  const infinite = endless.length === 1 ? infiniteClass(model, ground, endless[0].members) : undefined
  const closedClasses: CountableClass[] = [
    ...graph.bottoms.flatMap(({ members, beyond }) =>
      beyond.length > 0
        ? []
        : [
            {
              size: members.length,
              period: model.time === 'continuous' ? 1 : periodWithin(ground.exploration, members).period,
            },
          ],
    ),
    ...(infinite === undefined ? [] : [{ size: null, period: infinite.period }]),
    ...(endless.length > 1 && decision.recurrence !== 'transient'
      ? endless.map(() => ({ size: null, period: model.time === 'continuous' ? 1 : null }))
      : []),
  ]
  const structure =
    decision.recurrence === 'positive recurrent' && infinite !== undefined && closedClasses.length === 1
      ? structureOfEnds(model, ground, infinite, met)
      : undefined
  const name = model.elements[element]
  const drift: Drift[] = met.flatMap(({ at, own }) =>
    own.closed && own.drift !== undefined
      ? [{ of: name, where: at.end.outward === 1 ? 'far out' : 'far below', ...signed(own.drift, at.end.outward) }]
      : [],
  )
  const growth = growthOf(model, ground, met, decision.recurrence, explosive)
  return {
    recurrence: decision.recurrence,
    grade: decision.grade,
    basis:
      decision.grade === 'open'
        ? decision.says
        : `${decision.says} (${theorem === '' ? 'a finite closed class' : theorem})`,
    ...(theorem === '' || decision.grade === 'open' ? {} : { theorem }),
    checked: [...new Set(decisive.flatMap(({ own }) => own.checked))],
    ...(explosive ? { explosive } : {}),
    ...(decision.noSteadyState ? { noSteadyState: true } : {}),
    closedClasses,
    ...(drift.length > 0 ? { drift } : {}),
    ...(growth.length > 0 ? { growth } : {}),
    ...(structure === undefined ? {} : { structure }),
    remedies: [],
  }
}

const signed = (drift: { value: number; exact?: Drift['exact'] }, outward: 1 | -1): Pick<Drift, 'value' | 'exact'> =>
  outward === 1 || drift.exact === undefined
    ? { value: drift.value * outward + 0, ...(drift.exact === undefined ? {} : { exact: drift.exact }) }
    : {
        value: -drift.value + 0,
        exact: { numerator: -drift.exact.numerator, denominator: drift.exact.denominator },
      }

function metClasses({ ends }: Ground): MetClass[] {
  return ends.flatMap((at) => {
    const phases = new Set([...at.met].map((key) => Number(key.split('|')[0])))
    return at.classes.filter(({ members }) => members.some((phase) => phases.has(phase))).map((own) => ({ at, own }))
  })
}

/** The classes on which the decision rests. */
function decisiveClasses(met: readonly MetClass[], { recurrence }: Decision): readonly MetClass[] {
  const fates: Partial<Record<Decision['recurrence'], EndClass['fate']>> = {
    'null recurrent': 'late',
    transient: 'escapes',
    mixed: 'escapes',
    undetermined: 'unknown',
  }
  const wanted = fates[recurrence]
  const own = wanted === undefined ? met : met.filter(({ own }) => own.fate === wanted)
  return own.length === 0 ? met : own
}

interface Bottom {
  /** Listed states of it. */
  readonly members: readonly number[]
  /** Classes of phases that it may visit beyond the listing; none where it is finite. */
  readonly beyond: readonly MetClass[]
}

interface OverGraph {
  /** Closed classes. */
  readonly bottoms: readonly Bottom[]
  /** Listed states below all levels. */
  readonly middle: readonly number[]
}

/**
 * Closed classes of the listed states, where all that lies beyond the listing in one class of phases is one vertex that
 * may lead anywhere near the top in that class: it shows more ways than there are, so that what it calls closed is closed.
 */
function graphOf({ exploration, ends }: Ground, met: readonly MetClass[]): OverGraph {
  const size = exploration.states.length
  const heads: number[][] = exploration.heads.map((row) => [...row])
  const vertexOf = ends.map((at) => {
    const own = new Map<number, number>()
    met.forEach((each, k) => {
      if (each.at === at) for (const phase of each.own.members) own.set(phase, size + k)
    })
    return own
  })
  for (let k = 0; k < met.length; k++) heads.push([])
  ends.forEach((at, e) => {
    const { end, top, window, phaseOf } = at
    exploration.states.forEach((state, index) => {
      const count = countOf(end, state)
      if (count <= top - window) return
      const vertex = vertexOf[e].get(phaseOf(state) ?? -1)
      if (vertex === undefined) return
      if (count > top) heads[index].push(vertex)
      else heads[vertex].push(index)
    })
  })
  met.forEach(({ at, own }, k) => {
    const vertices = vertexOf[ends.indexOf(at)]
    for (const { to } of own.members.flatMap((phase) => at.end.arcs[phase])) {
      // A reset may lead to any listed state.
      if (to === undefined) for (let state = 0; state < size; state++) heads[size + k].push(state)
      else heads[size + k].push(vertices.get(to) ?? size + k)
    }
  })
  const { componentOf, count } = listedClasses(heads)
  const open = new Uint8Array(count)
  heads.forEach((row, k) => {
    for (const head of row) if (componentOf[head] !== componentOf[k]) open[componentOf[k]] = 1
  })
  const closed = new Map<number, number[]>()
  for (let k = 0; k < heads.length; k++) {
    const own = componentOf[k]
    if (open[own] !== 0) continue
    const members = closed.get(own)
    if (members === undefined) closed.set(own, [k])
    else members.push(k)
  }
  const bottoms = [...closed.values()].map((all) => ({
    members: all.filter((k) => k < size),
    beyond: all.filter((k) => k >= size).map((k) => met[k - size]),
  }))
  const middle = exploration.states.flatMap((state, k) =>
    ends.every(({ end }) => countOf(end, state) < end.level) ? [k] : [],
  )
  return { bottoms, middle }
}

function decide({ exploration }: Ground, met: readonly MetClass[], { bottoms, middle }: OverGraph): Decision {
  const open = (says: string): Decision => ({ recurrence: 'undetermined', grade: 'open', says })
  const unknown = met.find(({ own }) => own.fate === 'unknown')
  if (unknown !== undefined) return open(`no theorem here decides it: ${unknown.own.checked.join(', ')}`)
  // Listed states from which the process can, by listed ways, come so far out in such a class that it can climb on.
  const climbing = (fate: EndClass['fate']): Uint8Array => {
    const chosen = met.filter(({ own }) => own.closed && own.fate === fate)
    return reaching(exploration, (k) => {
      const state = exploration.states[k]
      return chosen.some(({ at, own }) => {
        if (countOf(at.end, state) < at.end.level + climbRoom(at.end, own)) return false
        const phase = at.phaseOf(state)
        return phase !== undefined && own.members.includes(phase)
      })
    })
  }
  const visits = ({ beyond }: Bottom, fate: EndClass['fate']): boolean =>
    beyond.some(({ own }) => own.closed && own.fate === fate)
  const below = new Set(middle)
  const allReach = (bottom: Bottom, marked: Uint8Array): boolean =>
    bottom.members.every((k) => !below.has(k) || marked[k] === 1)
  const steady = bottoms.filter((each) => !visits(each, 'escapes') && !visits(each, 'late'))
  const late = bottoms.filter((each) => !visits(each, 'escapes') && visits(each, 'late'))
  const away = bottoms.filter((each) => visits(each, 'escapes'))
  const finite = steady.every(({ beyond }) => beyond.length === 0)
  if (late.length > 0) {
    const marked = climbing('late')
    if (!late.every((each) => each.members.some((k) => below.has(k)) && allReach(each, marked))) {
      return open('it is not settled whether every return takes infinite mean time')
    }
  }
  if (met.some(({ own }) => own.closed && own.fate === 'escapes')) {
    const marked = climbing('escapes')
    if (marked[0] === 0) return open('it is not settled whether the part that drifts away is reached')
    if (steady.length > 0) {
      return {
        recurrence: 'mixed',
        grade: 'proved',
        says: `the model either drifts away for good or settles in a ${finite ? 'finite' : 'positive recurrent'} closed class, each with positive probability`,
      }
    }
    if (!away.every((each) => allReach(each, marked)))
      return open('some states lead to the part that drifts away, others may not')
    if (late.length > 0) {
      return {
        ...open('no steady state: the model either drifts away for good or keeps coming back in infinite mean time'),
        noSteadyState: true,
      }
    }
    return {
      recurrence: 'transient',
      grade: 'proved',
      says: 'from every state the model drifts away for good with positive probability, so it surely does in the end',
    }
  }
  if (late.length === 0) {
    const late = met.some(({ own }) => own.closed && own.fate === 'late')
    return {
      recurrence: 'positive recurrent',
      grade: 'proved',
      says: late
        ? 'the model surely comes back from far out, and ends in a closed class that has a steady state'
        : 'from far out the model comes back in finite mean time to finitely many states',
    }
  }
  if (steady.length > 0) {
    return {
      recurrence: 'mixed',
      grade: 'proved',
      says: `the model either settles in a ${finite ? 'finite' : 'positive recurrent'} closed class or keeps coming back in infinite mean time, each with positive probability`,
    }
  }
  return {
    recurrence: 'null recurrent',
    grade: 'proved',
    says: 'the model surely comes back, but the mean time until it does is infinite',
  }
}
