import { StillmarkError } from '../errors/stillmark-error.js'
import type { VariablesModel } from '../model/model.js'
import type { Classification } from './classification.js'
import { classifyCounters } from './counters.js'
import { type Exploration, exploreWithin, growingElements } from './exploration.js'
import { classifyWalk } from './lattice-walk.js'
import { type Copy, copiesOf } from './moves.js'
import { classifyOneVariable } from './one-variable.js'
import { classifyNetwork } from './open-network.js'
import { classifyByQuadratic } from './quadratic-drift.js'
import { classifyQuarterPlane } from './quarter-plane.js'
import { NotFollowed } from './rational.js'
import { NeedsModulus } from './reading.js'
import { remediesOf } from './remedies.js'

export interface ClassifyOptions {
  /** Leaves out the search for constants that would make the model steady. */
  readonly withoutRemedies?: boolean
  /**
   * What a pilot simulation shows where no theorem decides: taken over with the grade `indicated`, never more.
   */
  readonly evidence?: (model: VariablesModel) => Pick<Classification, 'recurrence' | 'basis'> | undefined
}

/** States of the first look at a model; the second number where the first look decides nothing. */
const sampleSizes: readonly number[] = [600, 6000]

/**
 * Decides whether a model whose states can't be listed is positive recurrent, null recurrent or transient, seen from its
 * start. `proved` only where every hypothesis of a published theorem was checked; else `indicated` or `open`.
 *
 * @throws StillmarkError where the model itself is at fault (a negative rate, a state outside its bounds)
 */
export function classifyCountable(model: VariablesModel, options: ClassifyOptions = {}): Classification {
  const decided = decide(model)
  if (decided.grade === 'open' && options.evidence !== undefined) {
    const shown = options.evidence(model)
    if (shown !== undefined) return { ...decided, recurrence: shown.recurrence, grade: 'indicated', basis: shown.basis }
  }
  const unsteady =
    decided.recurrence !== 'positive recurrent' && (decided.grade !== 'open' || decided.noSteadyState === true)
  if (options.withoutRemedies === true || !unsteady) return decided
  return { ...decided, remedies: remediesOf(model, decide) }
}

function decide(model: VariablesModel): Classification {
  let copies: readonly Copy[]
  try {
    copies = copiesOf(model)
  } catch (error) {
    return open([reasonOf(error)])
  }
  const decided = decideExactly(model, copies)
  // Rates without exact fractions were taken as doubles: a sign that follows from them is no proof.
  if (decided.grade !== 'proved' || copies[0]?.notes.approximate !== true) return decided
  const { noSteadyState: _, ...rest } = decided
  return {
    ...rest,
    grade: 'indicated',
    basis: `${decided.basis}; some rates are no fractions and were rounded, so this is not proved`,
  }
}

function decideExactly(model: VariablesModel, copies: readonly Copy[]): Classification {
  let found: Classification | undefined
  for (const size of sampleSizes) {
    const sample = exploreWithin(model, () => true, size)
    if (sample.complete) return finite(sample)
    const next = decideFrom(model, copies, sample)
    if (found === undefined || next.grade !== 'open') found = next
    if (found.grade !== 'open') break
  }
  return found as Classification
}

function decideFrom(model: VariablesModel, copies: readonly Copy[], sample: Exploration): Classification {
  const reasons: string[] = []
  const growing = growingElements(model, sample)
  const grown = growing.map(({ element }) => element)
  const varying = unboundedVarying(model, sample)
  for (const elements of distinct([grown, varying])) {
    const single = growing.find(({ element }) => element === elements[0])
    const ways: (() => Classification | undefined)[] =
      elements.length === 1
        ? [
            () => {
              const directions: (1 | -1)[] = [
                ...(single?.up ? [1 as const] : []),
                ...(single?.down ? [-1 as const] : []),
              ]
              return directions.length === 0 ? undefined : classifyOneVariable(model, copies, elements[0], directions)
            },
          ]
        : [
            () => classifyWalk(model, copies, elements),
            () => networkOrPlane(model, copies, elements),
            () =>
              elements.length === 2
                ? classifyByQuadratic(model, copies, [elements[0], elements[1]], sample)
                : undefined,
            () => classifyCounters(model, copies, elements, decide),
          ]
    let best: Classification | undefined
    for (const way of ways) {
      try {
        const found = way()
        if (found?.grade === 'proved') return found
        if (found !== undefined && (best === undefined || (best.grade === 'open' && found.grade === 'indicated')))
          best = found
      } catch (error) {
        reasons.push(reasonOf(error))
      }
    }
    if (best !== undefined) return best
  }
  return open(reasons)
}

/** Two stations are a quarter plane too: then both theorems are asked, and nothing is claimed where they differ. */
function networkOrPlane(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly number[],
): Classification | undefined {
  const network = classifyNetwork(model, copies, elements)
  if (elements.length !== 2) return network
  let plane: Classification | undefined
  try {
    plane = classifyQuarterPlane(model, copies, [elements[0], elements[1]])
  } catch (error) {
    if (network === undefined) throw error
    reasonOf(error)
  }
  if (network === undefined || plane === undefined) return network ?? plane
  if (network.grade === 'proved' && plane.grade === 'proved' && network.recurrence !== plane.recurrence) {
    return open(['two theorems contradict each other: this is a fault of the program'])
  }
  return { ...network, ...(plane.drift === undefined ? {} : { drift: plane.drift }) }
}

/** A model that turned out to have few states: each closed class is positive recurrent (Feller 1968, XV.6). */
const finite = (sample: Exploration): Classification => ({
  recurrence: 'positive recurrent',
  grade: 'proved',
  basis: `${sample.states.length.toLocaleString('en-US')} states: a finite closed class is positive recurrent (Feller 1968, XV.6)`,
  theorem: 'Feller 1968',
  checked: ['all states were listed'],
  closedClasses: [],
  remedies: [],
})

function open(reasons: readonly string[]): Classification {
  const why = [...new Set(reasons)].filter((reason) => reason !== '')
  return {
    recurrence: 'undetermined',
    grade: 'open',
    basis: why.length === 0 ? 'no theorem here fits the model' : `no theorem here fits the model: ${why.join('; ')}`,
    checked: [],
    closedClasses: [],
    remedies: [],
  }
}

/** What stopped a way of deciding; anything else than that is a fault of the program or of the model and goes on. */
function reasonOf(error: unknown): string {
  if (error instanceof NotFollowed) return error.why
  if (error instanceof NeedsModulus) return 'the moves depend on the remainder of an unbounded variable'
  // A state that the model itself never meets may be outside its bounds: then what was read can't be checked.
  if (error instanceof StillmarkError && error.kind === 'input') return error.what
  throw error
}

function unboundedVarying(model: VariablesModel, sample: Exploration): number[] {
  return model.elements.flatMap((_, element) =>
    (Number.isFinite(model.lower[element]) && Number.isFinite(model.upper[element])) ||
    sample.states.every((state) => state[element] === sample.states[0][element])
      ? []
      : [element],
  )
}

const distinct = (lists: readonly (readonly number[])[]): (readonly number[])[] =>
  lists.filter((list, k) => list.length > 0 && lists.findIndex((other) => other.join(' ') === list.join(' ')) === k)
