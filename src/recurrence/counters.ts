import { compile } from '../model/compile.js'
import type { VariablesModel } from '../model/model.js'
import { add, type Fraction, fraction, multiply, toNumber, zero } from '../numbers/fraction.js'
import type { Classification, Prediction } from './classification.js'
import { stateAt } from './classification.js'
import { occurring } from './dependence.js'
import { exploreWithin } from './exploration.js'
import { type Copy, type FarMove, movesAt } from './moves.js'
import { constantIn, NotFollowed } from './rational.js'
import { bodyOf } from './reading.js'

/** Elements that nothing reads but their own additions: plain variables only. */
export function unreadElements(model: VariablesModel, copies: readonly Copy[]): number[] {
  const read = new Set<number>()
  const position = new Map(model.elements.map((name, k) => [name, k] as const))
  for (const { rule, bound } of copies) {
    for (const part of [rule.when, rule.rate]) for (const element of occurring(model, part, bound)) read.add(element)
    for (const { variable, index, value } of rule.then) {
      const own = index === undefined ? position.get(variable) : undefined
      for (const element of occurring(model, value, bound)) if (element !== own) read.add(element)
      if (index !== undefined) for (const element of occurring(model, index, bound)) read.add(element)
    }
  }
  const arrays = new Set(bodyOf(model).variables.flatMap(({ name, index }) => (index === undefined ? [] : [name])))
  return model.elements.flatMap((name, k) => (read.has(k) || arrays.has(name.split('[')[0]) ? [] : [k]))
}

/** The model without some elements, which nothing else reads: its projection, a chain of its own. */
export function without(model: VariablesModel, dropped: readonly number[]): VariablesModel {
  const { scenario } = model
  const names = new Set(dropped.map((element) => model.elements[element]))
  const body = bodyOf(model)
  const projected = compile({
    ...scenario,
    measures: [],
    claims: [],
    body: {
      ...body,
      variables: body.variables.filter(({ name }) => !names.has(name)),
      transitions: body.transitions.map((rule) => ({
        ...rule,
        // biome-ignore lint/suspicious/noThenProperty: the key of a transition
        then: rule.then.filter(({ variable }) => !names.has(variable)),
      })),
    },
  })
  if (projected.kind !== 'variables' || projected.width === 0)
    throw new NotFollowed('nothing is left without the counters')
  return projected
}

/**
 * A model with counts that nothing reads. A state can only be recurrent where its projection is, and can't be where a
 * count that never falls grows in the recurrent class of the projection: the state is never met again (Chung 1967, I.4,
 * from memory).
 *
 * @param classify of the projection
 * @returns undefined where this decides nothing
 */
export function classifyCounters(
  model: VariablesModel,
  copies: readonly Copy[],
  growing: readonly number[],
  classify: (projection: VariablesModel) => Classification,
): Classification | undefined {
  const unread = unreadElements(model, copies).filter((element) => growing.includes(element))
  if (unread.length === 0 || unread.length === model.width) return undefined
  const projection = without(model, unread)
  const inner = classify(projection)
  if (inner.grade !== 'proved') return undefined
  const names = unread.map((element) => model.elements[element])
  const speeds = unread.flatMap((element) => constantSpeed(model, copies, element))
  if (inner.recurrence === 'transient') {
    return {
      ...inner,
      basis: `${inner.basis}; ${names.join(' and ')} ${names.length === 1 ? 'is' : 'are'} read by nothing and can't bring it back`,
      growth: [...(inner.growth ?? []).filter(({ name }) => name !== 'returns'), ...speeds],
      closedClasses: [],
      structure: { form: 'other', time: model.time, elements: growing },
    }
  }
  if (inner.recurrence !== 'positive recurrent' && inner.recurrence !== 'null recurrent') return undefined
  const states = statesOfClass(projection, inner)
  if (states === undefined) return undefined
  const grows = unread.find((element) => growsIn(model, copies, unread, element, states))
  if (grows === undefined) return undefined
  const name = model.elements[grows]
  return {
    recurrence: 'transient',
    grade: 'proved',
    basis: `${name} never falls and grows again and again while the rest goes on, so no state is met again (Chung 1967, I.4; the rest: ${inner.basis})`,
    theorem: 'Chung 1967',
    checked: [
      `nothing reads ${names.join(' and ')}`,
      `no transition lowers ${name}`,
      `${name} grows in the closed class of the rest`,
      ...inner.checked,
    ],
    closedClasses: [],
    ...(speeds.length > 0 ? { growth: speeds } : {}),
    structure: { form: 'other', time: model.time, elements: growing },
    remedies: [],
  }
}

/** Some states that certainly belong to the one closed class of a recurrent model; undefined where that is not known. */
function statesOfClass(
  model: VariablesModel,
  { structure, closedClasses }: Classification,
): (readonly number[])[] | undefined {
  if (closedClasses.length !== 1 || structure === undefined) return undefined
  switch (structure.form) {
    case 'levels':
      return [...structure.boundary, ...structure.phases.map((_, phase) => stateAt(structure, 1, phase))]
    case 'birth-death':
      return [0, 1, 2, 3].map((further) =>
        structure.state.map((value, k) => (k === structure.element ? value + further * structure.outward : value)),
      )
    case 'network':
      return structure.stations.every(({ throughput }) => throughput.numerator > 0n) ? sampleOf(model) : undefined
    case 'quarter-plane':
    case 'walk':
      return sampleOf(model)
    default:
      return undefined
  }
}

const sampleOf = (model: VariablesModel): (readonly number[])[] => [...exploreWithin(model, () => true, 500).states]

/** Moves in a state of the projection: the counts that nothing reads are symbols, so what is read holds for all of them. */
function movesIn(
  model: VariablesModel,
  copies: readonly Copy[],
  unread: readonly number[],
  state: readonly number[],
): readonly FarMove[] {
  let k = 0
  const values = Array.from({ length: model.width }, (_, element) => (unread.includes(element) ? 0 : state[k++]))
  return movesAt(model, copies, {
    counts: unread,
    outward: unread.map(() => 1 as const),
    values,
    modulus: 1,
    residue: 0,
  }).moves
}

function growsIn(
  model: VariablesModel,
  copies: readonly Copy[],
  unread: readonly number[],
  element: number,
  states: readonly (readonly number[])[],
): boolean {
  // No copy may ever lower it: its own additions are read with everything else unknown.
  if (!neverFalls(model, copies, element)) return false
  const position = unread.indexOf(element)
  return states.some((state) => movesIn(model, copies, unread, state).some(({ jump }) => (jump?.[position] ?? 0) > 0))
}

/** Every `then` of the element is itself plus a constant that is not negative. */
function neverFalls(model: VariablesModel, copies: readonly Copy[], element: number): boolean {
  const name = model.elements[element]
  return copies.every(({ rule, bound, notes }) =>
    rule.then.every(({ variable, value }) => {
      if (variable !== name) return true
      if ([...occurring(model, value, bound)].some((each) => each !== element)) return false
      // biome-ignore lint/suspicious/noThenProperty: the key of a transition
      const unguarded = { ...rule, when: always, rate: unit, then: [{ variable, value }] }
      const { moves } = movesAt({ ...model, time: 'continuous' }, [{ label: 0, rule: unguarded, bound, notes }], {
        counts: [element],
        outward: [1],
        values: Array.from(model.start),
        modulus: 1,
        residue: 0,
      })
      return moves.every(({ jump }) => jump !== undefined && jump[0] >= 0)
    }),
  )
}

const always = { kind: 'truth', value: true } as const
const unit = { kind: 'number', value: fraction(1) } as const

/** Speed of a count that moves by transitions of constant rates alone, always possible. */
function constantSpeed(model: VariablesModel, copies: readonly Copy[], element: number): Prediction[] {
  const name = model.elements[element]
  let speed: Fraction = zero
  for (const { label, rule, bound, notes } of copies) {
    if (rule.then.every(({ variable }) => variable !== name)) continue
    if (occurring(model, rule.when, bound).size > 0 || occurring(model, rule.rate, bound).size > 0) return []
    const { moves } = movesAt(
      { ...model, time: 'continuous' },
      // biome-ignore lint/suspicious/noThenProperty: the key of a transition
      [{ label, rule: { ...rule, then: rule.then.filter(({ variable }) => variable === name) }, bound, notes }],
      {
        counts: [element],
        outward: [1],
        values: Array.from(model.start),
        modulus: 1,
        residue: 0,
      },
    )
    for (const { jump, rate } of moves) {
      const constant = constantIn(rate)
      if (jump === undefined || constant === undefined) return []
      speed = add(speed, multiply(constant, fraction(jump[0])))
    }
  }
  return [
    {
      name: `speed_${name}`,
      value: toNumber(speed),
      exact: speed,
      means: `limit of ${name}(t) / t`,
      source: 'the law of large numbers',
    },
  ]
}
