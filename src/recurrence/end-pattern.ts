import type { VariablesModel } from '../model/model.js'
import { climbRoom, type EndClass, endClasses } from './end-class.js'
import { type End, phaseIndex, readEnd, remainder } from './ends.js'
import { type Exploration, exploreWithin } from './exploration.js'
import { agreesAt, type Copy } from './moves.js'
import { NotFollowed } from './rational.js'

/** States that are listed in all, and how often the listing is carried further out. */
const mostStates = 250_000
const mostDoublings = 6

/** An end with the phases that are truly met on it. */
export interface MetEnd {
  readonly end: End
  readonly classes: readonly EndClass[]
  /** Counts up to this are listed. */
  readonly top: number
  /** A multiple of the modulus, at least every jump: what is met repeats with it beyond `top - window`. */
  readonly window: number
  /** `phase|count modulo window` of what is met there. */
  readonly met: ReadonlySet<string>
  readonly phaseOf: (state: readonly number[]) => number | undefined
}

/** A class of phases that is truly met far out, on its end. */
export interface MetClass {
  readonly at: MetEnd
  readonly own: EndClass
}

export interface Ground {
  readonly exploration: Exploration
  readonly ends: readonly MetEnd[]
}

export const countOf = ({ element, outward }: End, state: readonly number[]): number => state[element] * outward

/**
 * Reads the ends of a model with one unbounded element and lists its states until what is met far out repeats itself
 * in a way that the moves far out can't leave: then the listed states below are all there are (an invariant, checked
 * phase by phase).
 * @throws NotFollowed
 */
export function groundOf(
  model: VariablesModel,
  copies: readonly Copy[],
  element: number,
  directions: readonly (1 | -1)[],
): Ground {
  const least = directions.length > 1 ? 1 : 0
  const settled = directions.map((outward) => settledEnd(model, copies, element, outward, least, directions))
  const classes = settled.map((end) => endClasses(end, model.time))
  const jumps = settled.map((end) => Math.max(1, ...end.arcs.flat().map(({ jump }) => Math.abs(jump))))
  const phases = Math.max(...settled.map((end) => end.phases.length / end.modulus))
  // States below the level may jump far beyond it: the listing goes on to where they land.
  const low = exploreWithin(model, (state) => settled.every((end) => countOf(end, state) <= end.level), mostStates)
  const reached = settled.map((end) => low.states.reduce((most, state) => Math.max(most, countOf(end, state)), 0))
  let tops = settled.map((end, k) => {
    const room = Math.max(...classes[k].map((own) => climbRoom(end, own)))
    const wanted = Math.max(end.level + room, reached[k]) + 8 * (jumps[k] + end.modulus) + 8
    const affordable = Math.floor(mostStates / (settled.length * Math.max(1, phases)))
    return Math.max(Math.min(wanted, affordable), end.level + 6 * (jumps[k] + end.modulus))
  })
  for (let attempt = 0; attempt < mostDoublings; attempt++) {
    const exploration = exploreWithin(
      model,
      (state) => settled.every((end, k) => countOf(end, state) <= tops[k]),
      mostStates * 2,
    )
    if (!exploration.complete) throw new NotFollowed('too many states have to be listed')
    const ends = settled.map((end, k) => metEnd(end, classes[k], tops[k], jumps[k], exploration))
    if (ends.every((end) => end !== undefined)) {
      probe(model, ends as MetEnd[])
      return { exploration, ends: ends as MetEnd[] }
    }
    tops = tops.map((top) => top * 2)
  }
  throw new NotFollowed('what can be met far out does not repeat itself')
}

/** Where the reading of an end begins; further out where something nearer can't be followed. */
const firstGuesses: readonly number[] = [0, 16, 128, 1024]

/** How far beyond the level states are listed to see which phases are met. */
const seedRange = 16

function settledEnd(
  model: VariablesModel,
  copies: readonly Copy[],
  element: number,
  outward: 1 | -1,
  least: number,
  directions: readonly (1 | -1)[],
): End {
  let failure: NotFollowed | undefined
  for (const first of firstGuesses) {
    try {
      let guess = Math.max(least, first)
      for (let attempt = 0; attempt < 8; attempt++) {
        const known = exploreWithin(
          model,
          (state) => directions.every((each) => state[element] * each <= guess + seedRange),
          mostStates,
        )
        if (!known.complete) throw new NotFollowed('too many states have to be listed')
        const seeds = known.states.filter((state) => state[element] * outward >= guess)
        if (seeds.length === 0) throw new NotFollowed('the level beyond which the moves stay the same is not reached')
        const end = readEnd(model, copies, element, outward, seeds)
        if (end.level <= guess) return { ...end, level: guess }
        guess = end.level
      }
      throw new NotFollowed('the level beyond which the moves stay the same keeps moving')
    } catch (error) {
      if (!(error instanceof NotFollowed)) throw error
      failure = error
    }
  }
  throw failure
}

function metEnd(
  end: End,
  classes: readonly EndClass[],
  top: number,
  jump: number,
  exploration: Exploration,
): MetEnd | undefined {
  const phaseOf = phaseIndex(end)
  const base = Math.ceil(jump / end.modulus) * end.modulus
  for (let times = 1; times <= 6; times++) {
    const window = base * times
    if (top - 3 * window < end.level) return undefined
    const met = new Set<string>()
    let fits = true
    exploration.states.forEach((state) => {
      const count = countOf(end, state)
      if (count <= top - window || count > top) return
      const phase = phaseOf(state)
      if (phase === undefined) fits = false
      else met.add(`${phase}|${remainder(count, window)}`)
    })
    // What lies just below has to repeat it too: a pattern that is still filling up is not the last.
    let below = 0
    exploration.states.forEach((state) => {
      const count = countOf(end, state)
      if (count <= top - 2 * window || count > top - window) return
      const phase = phaseOf(state)
      if (phase !== undefined && met.has(`${phase}|${remainder(count, window)}`)) below++
      else fits = false
    })
    if (!fits || below !== met.size) continue
    const closed = [...met].every((key) => {
      const [phase, residue] = key.split('|').map(Number)
      return end.arcs[phase].every(
        ({ to, jump: gain }) => to === undefined || met.has(`${to}|${remainder(residue + gain, window)}`),
      )
    })
    const entered = exploration.states.every((state) => {
      const count = countOf(end, state)
      return count <= top || met.has(`${phaseOf(state)}|${remainder(count, window)}`)
    })
    if (closed && entered) return { end, classes, top, window, met, phaseOf }
  }
  return undefined
}

/** Phases that are probed, spread over all. */
const probedPhases = 40

/** Holds what was read against the model's own moves: at the level, beyond it, and far out. @throws NotFollowed */
function probe(model: VariablesModel, ends: readonly MetEnd[]): void {
  for (const { end, met, top } of ends) {
    const phases = [...new Set([...met].map((key) => Number(key.split('|')[0])))]
    const step = Math.max(1, Math.floor(phases.length / probedPhases))
    for (let k = 0; k < phases.length; k += step) {
      const phase = phases[k]
      const place = end.phases[phase]
      for (const from of [end.level, end.level + 1, top, 2 * top + 17, 1000 + 7 * k, 1_000_003 + 37 * k]) {
        const count = from + remainder(place.residue - from, end.modulus)
        if (!agreesAt(model, place, end.far[phase], [count])) {
          throw new NotFollowed('the moves far out are not exactly those that were read')
        }
      }
    }
  }
}
