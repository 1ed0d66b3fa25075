import type { VariablesModel } from '../model/model.js'
import {
  add,
  divide,
  type Fraction,
  fraction,
  multiply,
  negate,
  sign,
  subtract,
  toNumber,
  zero,
} from '../numbers/fraction.js'
import type { Classification, LatticeMove, Prediction, QuarterPlane } from './classification.js'
import { exploreWithin, keyOf } from './exploration.js'
import { agreesAt, type Copy, movesAt, type Place } from './moves.js'
import { listedClasses, periodWithin } from './period-of-class.js'
import { constantIn, NotFollowed } from './rational.js'

interface Vector {
  readonly x: Fraction
  readonly y: Fraction
}

/**
 * Two counts on 0, 1, 2, … (from their lower bounds), whose moves are the same everywhere inside, along each axis.
 *
 * Source: Fayolle, Malyshev and Menshikov 1995, section 3.3, theorem 3.3.1 (from memory). M is the mean drift inside,
 * M' along the first axis (second count 0), M'' along the second. With M ≠ 0: positive recurrent if and only if
 * - Mx < 0, My < 0, MxM'y - MyM'x < 0 and MyM''x - MxM''y < 0, or
 * - Mx ≥ 0, My < 0 and MxM'y - MyM'x < 0, or the same with the axes exchanged;
 * transient where one of the expressions that count is positive, and where Mx ≥ 0, My ≥ 0.
 *
 * @returns undefined where the model has another form
 * @throws NotFollowed
 */
export function classifyQuarterPlane(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly [number, number],
): Classification | undefined {
  const plane = readPlane(model, copies, elements)
  if (plane === undefined) return undefined
  const names = elements.map((element) => model.elements[element])
  const [inside, first, second] = [plane.inside, plane.alongFirst, plane.alongSecond].map(driftOf)
  // Signs of the drift along an axis while the other count is in its own steady state there.
  const alongFirst = subtract(multiply(inside.x, first.y), multiply(inside.y, first.x))
  const alongSecond = subtract(multiply(inside.y, second.x), multiply(inside.x, second.y))
  const drift = [
    ...shownDrift(names, inside, 'inside'),
    ...shownDrift(names, first, `along ${names[0]}`),
    ...shownDrift(names, second, `along ${names[1]}`),
  ]
  const irreducible = communicates(model, elements)
  const period = model.time === 'continuous' ? 1 : irreducible ? periodNear(model, elements) : null
  const common = { drift, structure: plane, remedies: [] }
  const theorem = 'Fayolle, Malyshev and Menshikov 1995'
  const checked = [
    'inside and along each axis rates and jumps are the same everywhere, and the jumps are bounded',
    'no jump leads down by more than one',
    ...(irreducible ? ['all states communicate'] : []),
    `mean drift inside ${shown(inside)}, along ${names[0]} ${shown(first)}, along ${names[1]} ${shown(second)}`,
  ]
  const closedClasses = irreducible ? [{ size: null, period }] : []
  const open = (basis: string): Classification => ({
    ...common, recurrence: 'undetermined', grade: 'open', basis, checked, closedClasses,
  }) // biome-ignore format: one object
  const [mx, my] = [sign(inside.x), sign(inside.y)]
  if (!irreducible) return open('it is not settled whether all states communicate')
  if (mx === 0 && my === 0)
    return open('the mean drift inside is exactly 0, where the drift conditions of the quarter plane say nothing')
  const says = (what: string): string => `the mean drifts inside and along the axes ${what} (${theorem})`
  if (mx >= 0 && my >= 0) {
    const growth = [...speed(names[0], inside.x), ...speed(names[1], inside.y)]
    return {
      ...common,
      recurrence: 'transient',
      grade: 'proved',
      basis: says('lead away'),
      theorem,
      checked,
      closedClasses,
      growth,
    }
  }
  // Only an axis towards which the other count falls back can hold the process.
  const firstCounts = my < 0
  const secondCounts = mx < 0
  const [onFirst, onSecond] = [firstCounts ? sign(alongFirst) : -1, secondCounts ? sign(alongSecond) : -1]
  if (onFirst < 0 && onSecond < 0) {
    return {
      ...common,
      recurrence: 'positive recurrent',
      grade: 'proved',
      basis: says('lead back'),
      theorem,
      checked,
      closedClasses,
    }
  }
  if (onFirst > 0 || onSecond > 0) {
    const growth = escapeAlong(names, { inside, first, second }, onFirst, onSecond)
    return {
      ...common,
      recurrence: 'transient',
      grade: 'proved',
      basis: says('let one count run away along its axis'),
      theorem,
      checked,
      closedClasses,
      growth,
    }
  }
  return {
    ...common,
    recurrence: 'null recurrent',
    grade: 'indicated',
    noSteadyState: true,
    basis: `no steady state, since the mean drift along an axis is exactly balanced (${theorem}); that the model keeps coming back is not proved here`,
    theorem,
    checked,
    closedClasses,
  }
}

/** Along an axis the other count settles: the speed is its mean drift there. Where both axes lead away the path picks one. */
function escapeAlong(
  names: readonly string[],
  drifts: { readonly inside: Vector; readonly first: Vector; readonly second: Vector },
  onFirst: number,
  onSecond: number,
): Prediction[] {
  const { inside, first, second } = drifts
  if (onFirst > 0 && onSecond > 0) return []
  if (onFirst > 0) {
    // Share of time at 0 of the second count: the one that balances its drift.
    const atZero = divide(negate(inside.y), subtract(first.y, inside.y))
    return [...speed(names[0], mixed(atZero, first.x, inside.x)), ...speed(names[1], zero)]
  }
  const atZero = divide(negate(inside.x), subtract(second.x, inside.x))
  return [...speed(names[1], mixed(atZero, second.y, inside.y)), ...speed(names[0], zero)]
}

const mixed = (share: Fraction, a: Fraction, b: Fraction): Fraction =>
  add(multiply(share, a), multiply(subtract(fraction(1), share), b))

const speed = (name: string, value: Fraction): Prediction[] => [
  {
    name: `speed_${name}`,
    value: toNumber(value),
    exact: value,
    means: `limit of ${name}(t) / t`,
    source: 'Fayolle, Malyshev and Menshikov 1995 (from memory)',
  },
]

const shown = ({ x, y }: Vector): string =>
  `(${Number(toNumber(x).toPrecision(6))}, ${Number(toNumber(y).toPrecision(6))})`

const shownDrift = (names: readonly string[], { x, y }: Vector, where: string) => [
  { of: names[0], where, value: toNumber(x), exact: x },
  { of: names[1], where, value: toNumber(y), exact: y },
]

const driftOf = (moves: readonly LatticeMove[]): Vector => ({
  x: moves.reduce((sum, { jump, rate }) => add(sum, multiply(rate, fraction(jump[0]))), zero),
  y: moves.reduce((sum, { jump, rate }) => add(sum, multiply(rate, fraction(jump[1]))), zero),
})

function readPlane(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly [number, number],
): QuarterPlane | undefined {
  const [a, b] = elements
  const [lowA, lowB] = [model.lower[a], model.lower[b]]
  if (!Number.isFinite(lowA) || !Number.isFinite(lowB)) return undefined
  const start = Array.from(model.start)
  const readAt = (
    counts: readonly number[],
    fixed: readonly (readonly [number, number])[],
  ): LatticeMove[] | undefined => {
    const values = [...start]
    for (const [element, value] of fixed) values[element] = value
    const place: Place = { counts, outward: counts.map(() => 1 as const), values, modulus: 1, residue: 0 }
    const far = movesAt(model, copies, place)
    const from = counts.map((element) => model.lower[element] + 1)
    if (far.level > Math.min(...from)) return undefined
    const moves: LatticeMove[] = []
    for (const { jump, rate, values: after } of far.moves) {
      const constant = constantIn(rate)
      if (jump === undefined || constant === undefined) return undefined
      if (after.some((value, k) => !elements.includes(k) && value !== start[k])) return undefined
      const full = elements.map((element) => {
        const k = counts.indexOf(element)
        return k === -1 ? after[element] - values[element] : jump[k]
      })
      moves.push({ jump: full, rate: constant })
    }
    for (const away of [0, 1, 2, 5, 40, 977, 1_000_003]) {
      for (const other of [0, 1, 3, 1009]) {
        const at = counts.map((_, k) => from[k] + (k === 0 ? away : other))
        if (!agreesAt(model, place, far, at)) throw new NotFollowed('the moves are not exactly those that were read')
      }
    }
    return moves
  }
  const inside = readAt([a, b], [])
  const alongFirst = readAt([a], [[b, lowB]])
  const alongSecond = readAt([b], [[a, lowA]])
  const corner = readAt([], [[a, lowA], [b, lowB]]) // biome-ignore format: pairs
  if (inside === undefined || alongFirst === undefined || alongSecond === undefined || corner === undefined)
    return undefined
  return { form: 'quarter-plane', time: model.time, elements, inside, alongFirst, alongSecond, corner }
}

/** Half the side of the windows in which communication is checked. */
const half = 7

/**
 * Whether all states communicate: each state of a window near the corner does so with its neighbours further out, by
 * ways inside the window that keep off an axis wherever the state is to stand for those further along it.
 */
function communicates(model: VariablesModel, [a, b]: readonly [number, number]): boolean {
  const [lowA, lowB] = [model.lower[a], model.lower[b]]
  const side = 2 * half
  const all = exploreWithin(model, (state) => state[a] - lowA <= side && state[b] - lowB <= side, 20_000)
  if (!all.complete) return false
  const at = (x: number, y: number): number | undefined => {
    const state = Array.from(model.start)
    state[a] = lowA + x
    state[b] = lowB + y
    return all.indexOf.get(keyOf(state))
  }
  for (const [offX, offY] of [
    [0, 0],
    [1, 0],
    [0, 1],
    [1, 1],
  ]) {
    // biome-ignore format: pairs
    const kept = (k: number): boolean => {
      const [x, y] = [all.states[k][a] - lowA, all.states[k][b] - lowB]
      return x >= offX && x <= side && y >= offY && y <= side
    }
    const { componentOf } = listedClasses(all.heads.map((row, k) => (kept(k) ? row.filter(kept) : [])))
    for (let x = 0; x <= half; x++) {
      for (let y = 0; y <= half; y++) {
        // Edges of the window stand for what lies beyond: their ways must not use the axis they are moved away from.
        if ((x === half) !== (offX === 1) || (y === half) !== (offY === 1)) continue
        const own = at(x, y)
        const [right, above] = [at(x + 1, y), at(x, y + 1)]
        if (own === undefined || right === undefined || above === undefined) return false
        if (componentOf[own] !== componentOf[right] || componentOf[own] !== componentOf[above]) return false
      }
    }
  }
  return true
}

/** Period, where the window shows 1; null where it shows more, since further out there may be shorter ways. */
function periodNear(model: VariablesModel, [a, b]: readonly [number, number]): number | null {
  const [lowA, lowB] = [model.lower[a], model.lower[b]]
  const all = exploreWithin(model, (state) => state[a] - lowA <= 2 * half && state[b] - lowB <= 2 * half, 20_000)
  const { componentOf } = listedClasses(all.heads)
  const members = [...all.states.keys()].filter((k) => componentOf[k] === componentOf[0])
  const { period, labelOf } = periodWithin(all, members)
  if (period === 1) return 1
  // The labels must rise by the same along each axis everywhere: then they go on beyond the window.
  const changes = new Map<number, Set<number>>()
  for (const k of members) {
    for (const element of [a, b]) {
      const next = [...all.states[k]]
      next[element]++
      const label = labelOf.get(all.indexOf.get(keyOf(next)) ?? -1)
      if (label === undefined) continue
      const change = (((label - (labelOf.get(k) as number)) % period) + period) % period
      changes.set(element, (changes.get(element) ?? new Set()).add(change))
    }
  }
  return [...changes.values()].every((each) => each.size === 1) ? period : null
}
