import type { VariablesModel } from '../model/model.js'
import { add, type Fraction, toNumber, zero } from '../numbers/fraction.js'
import type { BirthDeath, CountableStructure, LevelStructure, RateArc, RateMatrix } from './classification.js'
import { countOf, type Ground, type MetClass, type MetEnd } from './end-pattern.js'
import { type Exploration, keyOf } from './exploration.js'
import type { InfiniteClass } from './infinite-class.js'
import { addRationals, constantIn, rationalFunction } from './rational.js'

/** The form in which the infinite class can be solved; undefined where none of the forms fits. */
export function structureOfEnds(
  model: VariablesModel,
  ground: Ground,
  infinite: InfiniteClass,
  met: readonly MetClass[],
): CountableStructure | undefined {
  const birthDeath = birthDeathOf(model, ground, infinite)
  const homogeneous = met.every(({ own }) => own.homogeneous)
  const levels = homogeneous ? levelsOf(model, ground, infinite) : undefined
  if (levels !== undefined) return birthDeath === undefined ? levels : { ...levels, birthDeath }
  if (birthDeath !== undefined) return birthDeath
  return { form: 'other', time: model.time, elements: [ground.ends[0].end.element] }
}

interface Started {
  readonly at: MetEnd
  /** First count of level 0. */
  readonly base: number
}

function levelsOf(model: VariablesModel, ground: Ground, infinite: InfiniteClass): LevelStructure | undefined {
  const { exploration, ends } = ground
  const inClass = (state: readonly number[]): boolean =>
    infinite.members.has(exploration.indexOf.get(keyOf(state)) ?? -1)
  const [{ end }] = ends
  const started: Started[] = []
  for (const at of ends) {
    const base = firstLevel(at, inClass, exploration)
    if (base === undefined) return undefined
    started.push({ at, base })
  }
  const phases: number[][] = []
  const levelStep: number[] = []
  const ownerOf: Started[] = []
  for (const each of started) {
    const { at, base } = each
    exploration.states.forEach((state, k) => {
      const count = countOf(at.end, state)
      if (count < base || count >= base + at.window || !infinite.members.has(k)) return
      phases.push([...state])
      levelStep.push(at.window * at.end.outward)
      ownerOf.push(each)
    })
  }
  const phaseAt = new Map(phases.map((state, k) => [keyOf(state), k] as const))
  const boundary = exploration.states.filter(
    (state, k) => infinite.members.has(k) && started.every(({ at, base }) => countOf(at.end, state) < base),
  )
  if (boundary.length === 0 || phases.length === 0) return undefined
  const boundaryAt = new Map(boundary.map((state, k) => [keyOf(state), k] as const))
  const m = phases.length
  const up = new Array<Fraction>(m * m).fill(zero)
  const local = new Array<Fraction>(m * m).fill(zero)
  const down = new Array<Fraction>(m * m).fill(zero)
  const boundaryDown = new Map<string, Fraction>()
  for (const [from, state] of phases.entries()) {
    const { at, base } = ownerOf[from]
    const phase = at.phaseOf(state)
    if (phase === undefined) return undefined
    const count = countOf(at.end, state)
    for (const { to, jump, rate } of at.end.arcs[phase]) {
      const value = constantIn(rate)
      if (to === undefined || value === undefined) return undefined
      const target = [...at.end.phases[to].values]
      const reached = count + jump
      const level = Math.floor((reached - base) / at.window)
      target[at.end.element] = (reached - level * at.window) * at.end.outward
      const index = phaseAt.get(keyOf(target))
      if (index === undefined || Math.abs(level) > 1) return undefined
      if (level === 0 && index === from) continue
      const matrix = level === 1 ? up : level === 0 ? local : down
      matrix[from * m + index] = add(matrix[from * m + index], value)
      if (level !== -1) continue
      const below = [...at.end.phases[to].values]
      below[at.end.element] = reached * at.end.outward
      const place = boundaryAt.get(keyOf(below))
      if (place === undefined) return undefined
      sumInto(boundaryDown, `${from} ${place}`, value)
    }
  }
  const insideBoundary = new Map<string, Fraction>()
  const boundaryUp = new Map<string, Fraction>()
  for (const [from, state] of boundary.entries()) {
    for (const { rate, next } of model.expandExactly(state)) {
      if (rate === undefined) return undefined
      const key = keyOf(next)
      const inside = boundaryAt.get(key)
      const phase = phaseAt.get(key)
      if (inside === from) continue
      if (inside !== undefined) sumInto(insideBoundary, `${from} ${inside}`, rate)
      else if (phase !== undefined) sumInto(boundaryUp, `${from} ${phase}`, rate)
      else return undefined
    }
  }
  return {
    form: 'levels',
    time: model.time,
    element: end.element,
    boundary,
    phases,
    levelStep,
    up: matrixOf(up),
    local: matrixOf(local),
    down: matrixOf(down),
    insideBoundary: arcsOf(insideBoundary),
    boundaryUp: arcsOf(boundaryUp),
    boundaryDown: arcsOf(boundaryDown),
  }
}

/** The first count, not below the level, from which windows of the class look alike, everything a boundary reaches lying within one. */
function firstLevel(
  { end, top, window }: MetEnd,
  inClass: (state: readonly number[]) => boolean,
  { states, heads }: Exploration,
): number | undefined {
  const lowest = states
    .filter(inClass)
    .reduce((least, state) => Math.min(least, countOf(end, state)), Number.POSITIVE_INFINITY)
  if (!Number.isFinite(lowest)) return undefined
  const from = Math.max(end.level, lowest + 1)
  // A boundary state must not jump over level 0: jumps from below the level may be longer than those beyond.
  const jumps = states.flatMap((state, k) =>
    countOf(end, state) < end.level && inClass(state) ? heads[k].map((head) => countOf(end, states[head])) : [],
  )
  const reached = jumps.reduce((most, count) => Math.max(most, count), from)
  for (let base = Math.max(from, reached - window + 1); base + 4 * window <= top; base++) {
    const patternAt = (first: number): string =>
      states
        .filter((state) => countOf(end, state) >= first && countOf(end, state) < first + window && inClass(state))
        .map(
          (state) =>
            `${state.map((value, k) => (k === end.element ? 0 : value)).join(' ')}|${countOf(end, state) - first}`,
        )
        .sort()
        .join(';')
    const own = patternAt(base)
    if (own !== '' && own === patternAt(base + window) && own === patternAt(base + 2 * window)) return base
  }
  return undefined
}

const sumInto = (sums: Map<string, Fraction>, key: string, value: Fraction): void => {
  sums.set(key, add(sums.get(key) ?? zero, value))
}

const arcsOf = (sums: ReadonlyMap<string, Fraction>): RateArc[] =>
  [...sums].map(([key, exact]) => {
    const [from, to] = key.split(' ').map(Number)
    return { from, to, exact, value: toNumber(exact) }
  })

const matrixOf = (exact: readonly Fraction[]): RateMatrix => ({ exact, value: Float64Array.from(exact, toNumber) })

/** The class as a birth-death process, where the element moves by one and nothing else changes. */
function birthDeathOf(model: VariablesModel, ground: Ground, infinite: InfiniteClass): BirthDeath | undefined {
  const { exploration, ends } = ground
  if (ends.length !== 1 || ends[0].end.modulus !== 1) return undefined
  const [{ end, phaseOf, top, window }] = ends
  const members = [...infinite.members].map((k) => exploration.states[k])
  const alike = members.every((state) => state.every((value, k) => k === end.element || value === members[0][k]))
  if (!alike) return undefined
  const counts = members.map((state) => countOf(end, state)).sort((a, b) => a - b)
  const first = counts[0]
  if (counts.some((count, k) => count !== first + k && count <= top - 2 * window)) return undefined
  const at = (count: number): number[] =>
    members[0].map((value, k) => (k === end.element ? count * end.outward : value))
  const beyond = Math.max(end.level, first + 1)
  const phase = phaseOf(at(beyond))
  if (phase === undefined) return undefined
  const arcs = end.arcs[phase]
  const births = arcs.filter(({ jump }) => jump === 1)
  const deaths = arcs.filter(({ jump }) => jump === -1)
  if (births.length + deaths.length !== arcs.length || births.length === 0 || deaths.length === 0) return undefined
  const birthBelow: Fraction[] = []
  const deathBelow: Fraction[] = []
  for (let count = first; count < beyond; count++) {
    let [up, down] = [zero, zero]
    for (const { rate, next } of model.expandExactly(at(count))) {
      const gain = countOf(end, next) - count
      if (rate === undefined || Math.abs(gain) > 1) return undefined
      if (gain === 1) up = add(up, rate)
      if (gain === -1) down = add(down, rate)
    }
    birthBelow.push(up)
    deathBelow.push(down)
  }
  const sum = (own: typeof arcs) => rationalFunction(own.map(({ rate }) => rate).reduce((a, b) => addRationals(a, b)))
  return {
    form: 'birth-death',
    time: model.time,
    element: end.element,
    state: at(first),
    first,
    outward: end.outward,
    birthBelow,
    deathBelow,
    beyond,
    birth: sum(births),
    death: sum(deaths),
  }
}
