import { strongComponents } from '../chain/strong-components.js'
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
  toNumber,
  zero,
} from '../numbers/fraction.js'
import { type BirthDeathVerdict, birthDeathVerdict, pureBirthExplodes } from './birth-death-series.js'
import type { End, EndArc } from './ends.js'
import { compressed } from './exploration.js'
import {
  correctors,
  doubleShares,
  exactPhases,
  exactShares,
  levelVariance,
  mostExactPhases,
  type PhaseArcs,
  staysInRange,
} from './phase-process.js'
import { addRationals, constantIn, expansionOf, orderOf, type Rational } from './rational.js'

/** A set of phases of an end that communicate far out, and what the level does while the process is in it. */
export interface EndClass {
  /** Indices into `end.phases`. */
  readonly members: readonly number[]
  /** No way out of it but through lower levels. */
  readonly closed: boolean
  /**
   * From far out: `soon`, the level comes below any mark in finite mean time; `late`, it surely comes back, in infinite
   * mean time; `escapes`, with positive probability never; `unknown`.
   */
  readonly fate: 'soon' | 'late' | 'escapes' | 'unknown'
  readonly theorem: string
  /** What was checked, or why it is unknown. */
  readonly checked: readonly string[]
  readonly explosive?: boolean
  /** Mean drift of the count per time unit, where the rates tend to constants. */
  readonly drift?: { readonly value: number; readonly exact?: Fraction }
  /** Where the drift is 0: variance per time unit, and twice the drift's 1/n coefficient over it. */
  readonly diffusion?: { readonly variance: number; readonly exactVariance?: Fraction; readonly weight: Fraction }
  readonly birthDeath?: BirthDeathVerdict & { readonly birth: Rational; readonly death: Rational }
  /** All rates are constants beyond the level. */
  readonly homogeneous: boolean
}

/** Smallest distance above the level from which the process can, staying on the end, climb as far as it likes. */
export const climbRoom = (end: End, own: EndClass): number =>
  own.members.length * Math.max(1, ...own.members.flatMap((k) => end.arcs[k].map(({ jump }) => -jump)))

/** The communicating classes of the phases, with their fates. */
export function endClasses(end: End, time: 'continuous' | 'discrete'): EndClass[] {
  const heads = end.arcs.map((row) => row.flatMap(({ to }) => (to === undefined ? [] : [to])))
  const { rowStart, target } = compressed(heads)
  const { count, componentOf } = strongComponents(rowStart, target)
  const members: number[][] = Array.from({ length: count }, () => [])
  componentOf.forEach((component, phase) => {
    members[component].push(phase)
  })
  return members.map((own) => {
    const inside = new Map(own.map((phase, k) => [phase, k] as const))
    const closed = own.every((phase) => end.arcs[phase].every(({ to }) => to !== undefined && inside.has(to)))
    const homogeneous = own.every((phase) => end.arcs[phase].every(({ rate }) => constantIn(rate) !== undefined))
    if (closed) return { members: own, closed, homogeneous, ...fateOf(end, own, inside, homogeneous, time) }
    // Constant rates: it is left after a time with an exponential tail, the level having moved by bounded jumps.
    return {
      members: own,
      closed,
      homogeneous,
      fate: homogeneous ? ('soon' as const) : ('unknown' as const),
      theorem: '',
      checked: homogeneous ? [] : ['it is not settled how long some phases last that are left for good far out'],
    }
  })
}

type Fate = Omit<EndClass, 'members' | 'closed' | 'homogeneous'>

function fateOf(
  end: End,
  members: readonly number[],
  inside: ReadonlyMap<number, number>,
  homogeneous: boolean,
  time: 'continuous' | 'discrete',
): Fate {
  const arcs = members.map((phase) => end.arcs[phase])
  const all = arcs.flat()
  if (all.every(({ jump }) => jump === 0)) {
    return { fate: 'unknown', theorem: '', checked: ['the count does not move in some phases far out'] }
  }
  if (all.every(({ jump }) => jump >= 0) && homogeneous) return onlyOut(arcs, members, inside)
  if (members.length === 1 && !homogeneous && all.every(({ jump }) => Math.abs(jump) <= 1)) return birthDeath(all, time)
  return asymptoticFate(arcs, members, inside, homogeneous, time)
}

/** The count never falls: each value is passed and never seen again. */
function onlyOut(
  arcs: readonly (readonly EndArc[])[],
  members: readonly number[],
  inside: ReadonlyMap<number, number>,
): Fate {
  const shares = sharesOf(
    scaled(
      arcs,
      inside,
      arcs.map(() => 0),
    ).limit,
  )
  return {
    fate: 'escapes',
    theorem: 'counters that only grow: no state is met again (Chung 1967, I.4, from memory)',
    checked: [
      `beyond the level the count never falls, and it grows in ${members.length === 1 ? 'its only phase' : 'a closed class of phases'}`,
    ],
    ...(shares === undefined ? {} : { drift: shares }),
  }
}

function birthDeath(all: readonly EndArc[], time: 'continuous' | 'discrete'): Fate {
  const birth = totalRate(all.filter(({ jump }) => jump === 1))
  const death = totalRate(all.filter(({ jump }) => jump === -1))
  if (birth === undefined) {
    return { fate: 'soon', theorem: 'a count that can only fall', checked: ['no birth far out'] }
  }
  if (death === undefined) {
    const explosive = time === 'continuous' && pureBirthExplodes(birth)
    return {
      fate: 'escapes',
      theorem: explosive ? 'Feller 1968 and Reuter 1957' : 'counters that only grow',
      checked: [
        `pure birth far out, the rate of order n^${orderOf(birth)}: the sum of 1/rate ${explosive ? 'converges' : 'diverges'}`,
      ],
      ...(explosive ? { explosive } : {}),
    }
  }
  const verdict = birthDeathVerdict(birth, death, time)
  const { recurrence, explosive } = verdict
  const ratio = verdict.limit === undefined ? 'without bound' : `to ${shown(verdict.limit)}`
  const exponent = verdict.exponent === undefined ? '' : `, the weights go like n^(${shown(verdict.exponent)})`
  return {
    fate: recurrence === 'positive recurrent' ? 'soon' : recurrence === 'null recurrent' ? 'late' : 'escapes',
    theorem: explosive ? 'Karlin and McGregor 1957 and Reuter 1957' : 'Karlin and McGregor 1957',
    checked: [
      'beyond the level the count moves by one, with birth and death rates that are positive rational functions of it',
      `birth over the next death goes ${ratio}${exponent} (Gauss's test)`,
    ],
    ...(explosive ? { explosive } : {}),
    birthDeath: { ...verdict, birth, death },
  }
}

function totalRate(arcs: readonly EndArc[]): Rational | undefined {
  if (arcs.length === 0) return undefined
  return arcs.map(({ rate }) => rate).reduce((sum, rate) => addRationals(sum, rate))
}

const shown = (value: Fraction): string =>
  value.denominator < 1000n
    ? value.denominator === 1n
      ? `${value.numerator}`
      : `${value.numerator}/${value.denominator}`
    : `${Number(toNumber(value).toPrecision(6))}`

/** Rates divided by the power of n of their phase, expanded to limit + first/n + …. */
function scaled(
  arcs: readonly (readonly EndArc[])[],
  inside: ReadonlyMap<number, number>,
  orders: readonly number[],
): { limit: PhaseArcs; first: PhaseArcs } {
  const part = (k: 0 | 1): PhaseArcs =>
    arcs.map((row, phase) =>
      row.flatMap(({ to, jump, rate }) => {
        const coefficient = expansionOf(rate, orders[phase], 2)[k]
        if (coefficient.numerator === 0n) return []
        return [{ to: inside.get(to as number) as number, jump, rate: coefficient }]
      }),
    )
  return { limit: part(0), first: part(1) }
}

/** Mean drift of an irreducible process: exact for few phases, in doubles with its error else. */
function sharesOf(limit: PhaseArcs): { value: number; exact?: Fraction } | undefined {
  if (limit.length <= exactPhases) {
    const exact = meanDrift(limit, exactShares(limit))
    return { value: toNumber(exact), exact }
  }
  return { value: doubleDrift(limit).value }
}

const phaseDrift = (row: PhaseArcs[number]): Fraction =>
  row.reduce((sum, { rate, jump }) => add(sum, multiply(rate, fraction(jump))), zero)

const meanDrift = (arcs: PhaseArcs, shares: readonly Fraction[]): Fraction =>
  arcs.reduce((sum, row, k) => add(sum, multiply(shares[k], phaseDrift(row))), zero)

function doubleDrift(arcs: PhaseArcs): { value: number; bound: number } {
  const { shares, relativeError } = doubleShares(arcs)
  let value = 0
  let size = 0
  arcs.forEach((row, k) => {
    for (const { rate, jump } of row) {
      const term = shares[k] * toNumber(rate) * jump
      value += term
      size += Math.abs(term)
    }
  })
  return { value, bound: size * (relativeError + 8 * arcs.length * Number.EPSILON) }
}

/**
 * Rates that tend to constants, after division by the power n^K of the largest in each phase (a change of clock that
 * leaves the embedded chain as it is).
 *
 * Drift of the limit process not 0: Foster 1953 with the function level + corrector(phase), whose drift goes to
 * n^K × the mean drift in every phase (where K < 0, with a power of that function); with constant rates this is Neuts 1981, theorem 1.7.1 and 3.1.1 (from memory).
 * Drift 0: Lamperti 1960 and 1963, with phases Georgiou and Wade 2014 (from memory): with 2c/σ² = w the process escapes
 * for w > 1, and for K = 0 comes back in finite mean time if and only if w < -1.
 */
function asymptoticFate(
  arcs: readonly (readonly EndArc[])[],
  members: readonly number[],
  inside: ReadonlyMap<number, number>,
  homogeneous: boolean,
  time: 'continuous' | 'discrete',
): Fate {
  const orders = arcs.map((row) => Math.max(...row.map(({ rate }) => orderOf(rate))))
  const { limit, first } = scaled(arcs, inside, orders)
  const [least, order] = [Math.min(...orders), Math.max(...orders)]
  const cores = closedCores(limit)
  const phases = `${members.length} ${members.length === 1 ? 'phase' : 'phases'}`
  const basis = homogeneous
    ? `beyond the level rates and jumps are the same everywhere, the jumps are bounded, and ${phases} ${members.length === 1 ? 'is' : 'are'} one closed class`
    : `beyond the level the rates are rational functions of the count, of order n^${order} at most, the jumps are bounded, ${phases}`
  const drifts = cores.map((core) => {
    const inCore = new Map(core.map((phase, k) => [phase, k] as const))
    return signedDrift(core.map((phase) => limit[phase].map((arc) => ({ ...arc, to: inCore.get(arc.to) as number }))))
  })
  const [drift] = drifts
  if (drift === undefined || drifts.some((each) => each === undefined)) {
    return {
      fate: 'unknown',
      theorem: '',
      checked: ['the drift is too near 0 for doubles and there are too many phases for fractions'],
    }
  }
  if (drifts.some((each) => each?.sign !== drift.sign) || (cores.length > 1 && drift.sign === 0)) {
    return { fate: 'unknown', theorem: '', checked: ['the phases fall apart in the limit of large counts'] }
  }
  const perTime =
    order === 0 && least === 0 && cores.length === 1
      ? { drift: { value: drift.value, ...(drift.exact === undefined ? {} : { exact: drift.exact }) } }
      : {}
  const theorem = homogeneous ? 'Neuts 1981' : 'Foster 1953'
  if (drift.sign < 0) {
    return { fate: 'soon', theorem, checked: [basis, 'the mean drift is inward'], ...perTime }
  }
  if (drift.sign > 0) {
    const explosive = time === 'continuous' && least >= 2
    return {
      fate: 'escapes',
      theorem: homogeneous ? theorem : 'Foster 1953 (transience: Meyn and Tweedie 1993, 8.4, from memory)',
      checked: [basis, 'the mean drift is outward'],
      ...(explosive ? { explosive } : {}),
      ...perTime,
    }
  }
  return balancedFate(
    limit,
    first,
    cores[0].length === members.length,
    least === order ? order : undefined,
    homogeneous,
    basis,
    perTime,
  )
}

/** The closed classes of the limit process. */
function closedCores(limit: PhaseArcs): number[][] {
  const { rowStart, target } = compressed(limit.map((row) => row.map(({ to }) => to)))
  const { count, componentOf } = strongComponents(rowStart, target)
  const open = new Uint8Array(count)
  limit.forEach((row, k) => {
    for (const { to } of row) if (componentOf[to] !== componentOf[k]) open[componentOf[k]] = 1
  })
  return [...open.keys()]
    .filter((component) => open[component] === 0)
    .map((component) => [...limit.keys()].filter((phase) => componentOf[phase] === component))
}

function signedDrift(arcs: PhaseArcs): { sign: -1 | 0 | 1; value: number; exact?: Fraction } | undefined {
  if (arcs.length > exactPhases) {
    const { value, bound } = doubleDrift(arcs)
    if (Math.abs(value) > bound) return { sign: value > 0 ? 1 : -1, value }
    if (arcs.length > mostExactPhases) return undefined
  }
  const exact = meanDrift(arcs, exactShares(arcs))
  return { sign: sign(exact), value: toNumber(exact), exact }
}

function balancedFate(
  limit: PhaseArcs,
  first: PhaseArcs,
  irreducible: boolean,
  order: number | undefined,
  homogeneous: boolean,
  basis: string,
  perTime: Pick<Fate, 'drift'>,
): Fate {
  const unknown = (why: string): Fate => ({ fate: 'unknown', theorem: '', checked: [why], ...perTime })
  if (!irreducible) return unknown('the drift is 0 in the limit, and the phases do not all last there')
  if (staysInRange(limit)) return unknown('the level stays in a finite range in the limit')
  if (limit.length > mostExactPhases) return unknown('the drift is 0 in the limit, with too many phases for fractions')
  const shares = exactShares(limit)
  const corrector = correctors(limit, zero)
  const variance = levelVariance(limit, shares, corrector)
  // Drift of level + corrector at order 1/n: what the second terms of the rates make of it.
  let bend = zero
  first.forEach((row, k) => {
    for (const { to, jump, rate } of row) {
      const step = add(fraction(jump), subtract(corrector[to], corrector[k]))
      bend = add(bend, multiply(multiply(shares[k], rate), step))
    }
  })
  const weight = divide(multiply(fraction(2), bend), variance)
  const diffusion = { variance: toNumber(variance), exactVariance: variance, weight }
  const checked = [basis, 'the mean drift is exactly 0']
  if (homogeneous)
    return {
      fate: 'late',
      theorem: 'Neuts 1981',
      checked: [...checked, 'the level is not confined to a range'],
      diffusion,
      ...perTime,
    }
  const several = limit.length > 1
  const theorem = several ? 'Lamperti 1960 and 1963, with phases Georgiou and Wade 2014' : 'Lamperti 1960 and 1963'
  const lamperti = [
    ...checked.slice(0, 1),
    'the mean drift tends to 0',
    `twice its 1/n coefficient over the variance is ${shown(weight)}`,
  ]
  const above = compare(weight, one)
  const edge = above === 0 || compare(weight, negate(one)) === 0
  if (edge && (several || order !== 0)) return unknown(`the drift is exactly at the edge of Lamperti's criterion`)
  // With another clock the process is a Bessel process only in that clock's time: no law for the model's own follows.
  if (above > 0)
    return { fate: 'escapes', theorem, checked: lamperti, ...(order === 0 ? { diffusion } : {}), ...perTime }
  if (order === undefined) return unknown('the drift is 0 in the limit and some phases are faster than others there')
  if (order === 0) {
    return {
      fate: compare(weight, negate(one)) < 0 ? 'soon' : 'late',
      theorem,
      checked: lamperti,
      diffusion,
      ...perTime,
    }
  }
  // n^p with p = 2 - K, or any p below 1 - w where K >= 2: its drift is at most -ε (Foster 1953).
  if (compare(weight, fraction(order - 1)) < 0) {
    return { fate: 'soon', theorem: 'Foster 1953 with a power of the level', checked: lamperti, ...perTime }
  }
  return unknown('the drift is 0 in the limit and the rates grow with the count')
}
