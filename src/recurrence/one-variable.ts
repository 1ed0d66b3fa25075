import type { VariablesModel } from '../model/model.js'
import type { Classification, CountableClass, Drift } from './classification.js'
import { climbRoom, type EndClass } from './end-class.js'
import { countOf, type Ground, groundOf, type MetEnd } from './end-pattern.js'
import type { Exploration } from './exploration.js'
import { reaching } from './exploration.js'
import { growthOf } from './growth.js'
import { infiniteClass } from './infinite-class.js'
import { structureOfEnds } from './level-structure.js'
import type { Copy } from './moves.js'
import { listedClasses, periodWithin } from './period-of-class.js'

/** A class of phases that is truly met far out, on its end. */
export interface MetClass {
  readonly at: MetEnd
  readonly own: EndClass
}

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
  sample: Exploration,
): Classification {
  const ground = groundOf(model, copies, element, directions, sample)
  const met = metClasses(ground)
  const graph = graphOf(ground)
  const decision = decide(ground, met, graph)
  const decisive = decisiveClasses(met, decision)
  const theorem = [...new Set(decisive.map(({ own }) => own.theorem).filter((each) => each !== ''))].join('; ')
  const explosive = decision.recurrence !== 'undetermined' && met.some(({ own }) => own.explosive === true)
  const infinite = infiniteClass(model, ground, graph.bottoms)
  const closedClasses: CountableClass[] = [
    ...graph.finiteBottoms.map((members) => ({
      size: members.length,
      period: model.time === 'continuous' ? 1 : periodWithin(ground.exploration, members).period,
    })),
    ...(infinite === undefined ? [] : [{ size: null, period: infinite.period }]),
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

export interface OverGraph {
  /** Closed classes that are finite and wholly listed. */
  readonly finiteBottoms: readonly (readonly number[])[]
  /** Listed states of those that go on without end. */
  readonly bottoms: readonly (readonly number[])[]
  /** Listed states below all levels. */
  readonly middle: readonly number[]
}

/**
 * Bottom classes of the listed states, where all that lies beyond the listing on one end is one vertex that may lead
 * anywhere near the top: it shows more ways than there are, so that what it calls closed is closed.
 */
function graphOf({ exploration, ends }: Ground): OverGraph {
  const size = exploration.states.length
  const heads: number[][] = exploration.heads.map((row) => [...row])
  ends.forEach(({ end, top, window }, k) => {
    const beyond = size + k
    const ways: number[] = []
    exploration.states.forEach((state, index) => {
      const count = countOf(end, state)
      if (count > top) heads[index].push(beyond)
      if (count > top - window) ways.push(index)
    })
    heads.push(ways)
    for (const row of end.arcs)
      if (row.some(({ to }) => to === undefined)) heads[beyond].push(...resetTargets(exploration, end.element))
  })
  const { componentOf, count } = listedClasses(heads)
  const open = new Uint8Array(count)
  heads.forEach((row, k) => {
    for (const head of row) if (componentOf[head] !== componentOf[k]) open[componentOf[k]] = 1
  })
  const members = new Map<number, number[]>()
  for (let k = 0; k < size + ends.length; k++) {
    const own = componentOf[k]
    if (open[own] === 0) members.set(own, [...(members.get(own) ?? []), k])
  }
  const finiteBottoms: number[][] = []
  const bottoms: number[][] = []
  for (const own of members.values()) {
    if (own.some((k) => k >= size)) bottoms.push(own.filter((k) => k < size))
    else finiteBottoms.push(own)
  }
  const middle = exploration.states.flatMap((state, k) =>
    ends.every(({ end }) => countOf(end, state) < end.level) ? [k] : [],
  )
  return { finiteBottoms, bottoms, middle }
}

/** A reset leads from the top where it leads from the states listed: they stand in their own rows; coarsely, anywhere. */
const resetTargets = (exploration: Exploration, _element: number): number[] => [...exploration.states.keys()]

function decide(ground: Ground, met: readonly MetClass[], graph: OverGraph): Decision {
  const { exploration } = ground
  const { finiteBottoms, bottoms, middle } = graph
  const open = (says: string): Decision => ({ recurrence: 'undetermined', grade: 'open', says })
  const unknown = met.find(({ own }) => own.fate === 'unknown')
  if (unknown !== undefined) return open(`no theorem here decides it: ${unknown.own.checked.join(', ')}`)
  const climbing = (fate: EndClass['fate']) => {
    const chosen = met.filter(({ own }) => own.closed && own.fate === fate)
    return reaching(exploration, (k) => {
      const state = exploration.states[k]
      return chosen.some(({ at, own }) => {
        const count = countOf(at.end, state)
        if (count < at.end.level + climbRoom(at.end, own)) return false
        const phase = at.phaseOf(state)
        return phase !== undefined && own.members.includes(phase)
      })
    })
  }
  const has = (fate: EndClass['fate']): boolean => met.some(({ own }) => own.closed && own.fate === fate)
  const name = 'the model'
  if (has('escapes')) {
    const escapes = climbing('escapes')
    if (escapes[0] === 0) return open('it is not settled whether the part that drifts away is reached')
    if (middle.every((k) => escapes[k] === 1)) {
      return {
        recurrence: 'transient',
        grade: 'proved',
        says: `from every state ${name} drifts away for good with positive probability, so it surely does in the end`,
      }
    }
    if (finiteBottoms.length > 0) {
      return {
        recurrence: 'mixed',
        grade: 'proved',
        says: `${name} either drifts away for good or settles in a finite closed class, each with positive probability`,
      }
    }
    return open('some states lead to the part that drifts away, others do not')
  }
  const settles: Decision = {
    recurrence: 'positive recurrent',
    grade: 'proved',
    says: `from far out ${name} comes back in finite mean time to finitely many states`,
  }
  if (!has('late')) return settles
  if (bottoms.length === 0) {
    return { ...settles, says: `${name} surely comes back from far out, and ends in a finite closed class` }
  }
  const late = climbing('late')
  const inBottom = new Set(bottoms.flat())
  const lower = middle.filter((k) => inBottom.has(k))
  if (lower.length === 0 || lower.some((k) => late[k] === 0))
    return open('it is not settled whether every return takes infinite mean time')
  if (finiteBottoms.length > 0) {
    return {
      recurrence: 'mixed',
      grade: 'proved',
      says: `${name} either settles in a finite closed class or keeps coming back in infinite mean time, each with positive probability`,
    }
  }
  return {
    recurrence: 'null recurrent',
    grade: 'proved',
    says: `${name} surely comes back, but the mean time until it does is infinite`,
  }
}
