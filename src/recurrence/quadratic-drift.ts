import type { VariablesModel } from '../model/model.js'
import {
  add,
  compare,
  divide,
  type Fraction,
  fraction,
  multiply,
  negate,
  one,
  sign,
  subtract,
  toText,
  zero,
} from '../numbers/fraction.js'
import type { Classification } from './classification.js'
import type { Exploration } from './exploration.js'
import { agreesAt, type Copy, type FarMoves, movesAt, type Place } from './moves.js'
import { constantIn, NotFollowed } from './rational.js'
import { simplestBetween } from './simplest-fraction.js'

/** Width of the strips along the axes that are read line by line, and phases that are followed. */
const widestStrip = 64
const mostPhases = 200

/** Mean drifts of the two counts in one line of states, or inside. */
interface Drifts {
  readonly x: Fraction
  readonly y: Fraction
}

/**
 * Two counts with finitely many phases and strips of any width along the axes, by Foster's criterion (Foster 1953) with
 * V = p x² + 2 q x y + r y²: its drift falls linearly far out where p Mx + q My < 0 and q Mx + r My < 0 inside, the first
 * in every line along the first axis, the second along the other. The conditions bound p and r apart, so that weights
 * are found or seen not to exist by comparing fractions. Sufficient, not necessary: it proves a steady state or nothing.
 *
 * @returns undefined where it proves nothing
 * @throws NotFollowed
 */
export function classifyByQuadratic(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly [number, number],
  sample: Exploration,
): Classification | undefined {
  if (elements.some((element) => !Number.isFinite(model.lower[element]))) return undefined
  let strip = Math.max(1, ...elements.map((element) => model.lower[element] + 1))
  for (;;) {
    const read = readRegions(model, copies, elements, sample, strip)
    if (read.level > widestStrip) throw new NotFollowed('the moves change too far from the axes')
    if (read.level > strip) {
      strip = read.level
      continue
    }
    const weights = findWeights(read)
    if (weights === undefined) return undefined
    const { p, q, r } = weights
    return {
      recurrence: 'positive recurrent',
      grade: 'proved',
      basis: `the drift of ${toText(p)} x² + ${toText(multiply(fraction(2), q))} x y + ${toText(r)} y² is negative outside a finite set (Foster 1953)`,
      theorem: 'Foster 1953',
      checked: [
        `from ${strip} on rates and jumps are the same everywhere inside and along each line beside an axis, and the jumps are bounded`,
        `that function of x = ${model.elements[elements[0]]} and y = ${model.elements[elements[1]]} has negative drift in all ${read.phases} phases far out`,
      ],
      closedClasses: [],
      structure: { form: 'other', time: model.time, elements },
      remedies: [],
    }
  }
}

interface Regions {
  readonly inside: readonly Drifts[]
  readonly alongFirst: readonly Drifts[]
  readonly alongSecond: readonly Drifts[]
  readonly level: number
  readonly phases: number
}

function readRegions(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly [number, number],
  sample: Exploration,
  strip: number,
): Regions {
  const phases: number[][] = []
  const known = new Set<string>()
  const meet = (values: readonly number[]): void => {
    const own = values.map((value, k) => (elements.includes(k) ? 0 : value))
    if (known.has(own.join(' '))) return
    if (phases.length >= mostPhases) throw new NotFollowed('there are too many phases beside the unbounded variables')
    known.add(own.join(' '))
    phases.push(own)
  }
  for (const state of sample.states) meet(state)
  const regions = { inside: [] as Drifts[], alongFirst: [] as Drifts[], alongSecond: [] as Drifts[] }
  let level = Number.NEGATIVE_INFINITY
  const readAt = (into: Drifts[], counts: readonly number[], values: readonly number[]): void => {
    const place: Place = { counts, outward: counts.map(() => 1 as const), values, modulus: 1, residue: 0 }
    const far = movesAt(model, copies, place)
    level = Math.max(level, far.level)
    into.push(driftsOf(far, place, elements))
    for (const move of far.moves) meet(move.values)
    const from = Math.max(strip, far.level)
    for (const away of [0, 1, 30, 5003]) {
      if (
        !agreesAt(
          model,
          place,
          far,
          counts.map((_, k) => from + away * (k + 1)),
        )
      ) {
        throw new NotFollowed('the moves are not exactly those that were read')
      }
    }
  }
  for (let k = 0; k < phases.length; k++) {
    readAt(regions.inside, elements, phases[k])
    const [a, b] = elements
    for (const [into, free, fixed] of [
      [regions.alongFirst, a, b],
      [regions.alongSecond, b, a],
    ] as const) {
      for (let value = model.lower[fixed]; value < strip; value++) {
        readAt(
          into,
          [free],
          phases[k].map((each, element) => (element === fixed ? value : each)),
        )
      }
    }
  }
  return { ...regions, level, phases: phases.length }
}

function driftsOf(far: FarMoves, place: Place, elements: readonly [number, number]): Drifts {
  const drift = [zero, zero]
  for (const { rate, jump, values } of far.moves) {
    const constant = constantIn(rate)
    if (constant === undefined || jump === undefined)
      throw new NotFollowed('rates or jumps grow with an unbounded variable')
    elements.forEach((element, k) => {
      const position = place.counts.indexOf(element)
      const gain = position === -1 ? values[element] - place.values[element] : jump[position]
      drift[k] = add(drift[k], multiply(constant, fraction(gain)))
    })
  }
  return { x: drift[0], y: drift[1] }
}

/** Weights of a form that is positive on both counts, with all conditions strict. */
function findWeights({
  inside,
  alongFirst,
  alongSecond,
}: Regions): { p: Fraction; q: Fraction; r: Fraction } | undefined {
  for (const q of [zero, one, negate(one)]) {
    const p = between([...inside, ...alongFirst].map(({ x, y }) => ({ own: x, other: multiply(q, y) })))
    const r = between([...inside, ...alongSecond].map(({ x, y }) => ({ own: y, other: multiply(q, x) })))
    if (p === undefined || r === undefined) continue
    if (sign(q) >= 0 || compare(multiply(p, r), one) > 0) return { p, q, r }
  }
  return undefined
}

/** A weight w > 0 with w·own + other < 0 for all; a large one where nothing bounds it. */
function between(conditions: readonly { readonly own: Fraction; readonly other: Fraction }[]): Fraction | undefined {
  let low = zero
  let high: Fraction | undefined
  for (const { own, other } of conditions) {
    const side = sign(own)
    if (side === 0) {
      if (sign(other) >= 0) return undefined
      continue
    }
    const bound = divide(negate(other), own)
    if (side > 0) {
      if (high === undefined || compare(bound, high) < 0) high = bound
    } else if (compare(bound, low) > 0) low = bound
  }
  if (high === undefined) return add(multiply(low, fraction(2)), one)
  if (compare(low, high) >= 0) return undefined
  const third = divide(subtract(high, low), fraction(3))
  return simplestBetween(add(low, third), subtract(high, third))
}
