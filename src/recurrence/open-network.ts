import type { VariablesModel } from '../model/model.js'
import {
  add,
  compare,
  divide,
  type Fraction,
  multiply,
  one,
  sign,
  subtract,
  toNumber,
  zero,
} from '../numbers/fraction.js'
import type { Classification, NetworkStation, OpenNetwork, Prediction } from './classification.js'
import { occurring } from './dependence.js'
import { type Copy, movesAt, type Place, stateOf } from './moves.js'
import {
  addRationals,
  constantIn,
  evaluateRational,
  expansionOf,
  multiplyRationals,
  NotFollowed,
  orderOf,
  type Rational,
  rationalFunction,
  rationalOf,
  sameRational,
} from './rational.js'

/** A rate as a function of one station's count: values below `beyond`, then a rational function. */
interface CountFunction {
  readonly below: readonly Fraction[]
  readonly beyond: number
  readonly far: Rational
}

/** Counts up to which a station's rate is tabulated. */
const longestTable = 2000

/**
 * An open network in product form: customers come from outside at constant rates, and leave each station at a rate
 * that depends only on its own count, to fixed shares of destinations.
 *
 * Sources: Jackson 1957 and 1963 (product form; the steady state exists if and only if every station, alone with its
 * throughput by the traffic equations, has one); the non-ergodic case: Goodman and Massey 1984, Chen and Mandelbaum
 * 1991 (flows with bottlenecks). From memory.
 *
 * @returns undefined where the model has another form
 * @throws NotFollowed
 */
export function classifyNetwork(
  model: VariablesModel,
  copies: readonly Copy[],
  elements: readonly number[],
): Classification | undefined {
  if (model.time !== 'continuous') return undefined
  const flows = readFlows(model, copies, elements)
  if (flows === undefined) return undefined
  const stations = elements.length
  const names = elements.map((element) => model.elements[element])
  const throughput = solveTraffic(flows.arrivals, flows.routing, new Set())
  if (throughput === undefined) return undefined
  const judged = elements.map((_, k) => judgeStation(throughput[k], flows.service[k]))
  const structure: OpenNetwork = {
    form: 'network',
    time: 'continuous',
    stations: elements.map(
      (element, k): NetworkStation => ({
        element,
        arrivals: flows.arrivals[k],
        throughput: throughput[k],
        serviceBelow: flows.service[k].below,
        beyond: flows.service[k].beyond,
        service: rationalFunction(flows.service[k].far),
        recurrence: judged[k],
      }),
    ),
    routing: flows.routing.flat(),
  }
  const theorem = 'Jackson 1957 and 1963'
  const checked = [
    'arrivals from outside have constant rates and are never refused',
    `each of ${stations} stations is left at a rate that depends only on its own count, to fixed shares of destinations`,
    'the traffic equations have one solution, and every customer leaves in the end',
  ]
  const fed = throughput.every((each) => each.numerator > 0n)
  const common = { structure, remedies: [], closedClasses: [{ size: null, period: 1 }] }
  if (judged.every((each) => each === 'positive recurrent')) {
    return {
      ...common,
      recurrence: 'positive recurrent',
      grade: 'proved',
      basis: `an open network in product form, and every station has a steady state with its throughput (${theorem})`,
      theorem,
      checked: [...checked, ...(fed ? [] : ['stations that no arrival reaches run empty'])],
    }
  }
  const busy = names.filter((_, k) => judged[k] !== 'positive recurrent')
  if (judged.some((each) => each === 'overloaded') && fed) {
    const speeds = bottleneckSpeeds(flows, names)
    if (speeds !== undefined) {
      return {
        ...common,
        recurrence: 'transient',
        grade: 'proved',
        basis: `an open network in which ${busy.join(' and ')} ${busy.length === 1 ? 'gets' : 'get'} more than can be served (Goodman and Massey 1984, Chen and Mandelbaum 1991)`,
        theorem: 'Jackson 1963; Goodman and Massey 1984; Chen and Mandelbaum 1991',
        checked: [...checked, 'the traffic equations with bottlenecks leave a station with more input than service'],
        growth: speeds,
      }
    }
  }
  return {
    ...common,
    recurrence: judged.filter((each) => each === 'critical').length === 1 && fed ? 'null recurrent' : 'undetermined',
    grade: judged.filter((each) => each === 'critical').length === 1 && fed ? 'indicated' : 'open',
    ...(fed ? { noSteadyState: true } : {}),
    basis: `no steady state, since ${busy.join(' and ')} can't keep up or just keeps up (${theorem}); whether the model keeps coming back is not proved here`,
    theorem,
    checked,
  }
}

interface Flows {
  readonly arrivals: readonly Fraction[]
  readonly routing: readonly (readonly Fraction[])[]
  readonly service: readonly CountFunction[]
}

function readFlows(model: VariablesModel, copies: readonly Copy[], elements: readonly number[]): Flows | undefined {
  const start = Array.from(model.start)
  const place: Place = {
    counts: elements,
    outward: elements.map(() => 1 as const),
    values: start,
    modulus: 1,
    residue: 0,
  }
  if (elements.some((element) => model.lower[element] !== 0)) return undefined
  const others = start.map((value, k) => (elements.includes(k) ? 0 : value))
  const far = movesAt(model, copies, place)
  // Copies that move nothing far out may still do so near 0: every copy has to be one of a station that was seen.
  const arrivals = new Array<Fraction>(elements.length).fill(zero)
  const leaving: { readonly from: number; readonly to: number | undefined; readonly labels: number[] }[] = []
  const seen = new Set<number>()
  for (const { label, jump, values, rate } of far.moves) {
    if (jump === undefined || values.some((value, k) => value !== others[k])) return undefined
    const gains = jump.flatMap((each, k) => (each === 1 ? [k] : []))
    const losses = jump.flatMap((each, k) => (each === -1 ? [k] : []))
    const moved = jump.filter((each) => each !== 0).length
    if (gains.length > 1 || losses.length > 1 || gains.length + losses.length !== moved) return undefined
    seen.add(label)
    const { rule, bound } = copies[label]
    const depends = [...occurring(model, rule.when, bound), ...occurring(model, rule.rate, bound)].map((element) =>
      elements.indexOf(element),
    )
    if (losses.length === 0) {
      if (depends.length > 0) return undefined
      const constant = constantIn(rate)
      if (constant === undefined) return undefined
      arrivals[gains[0]] = add(arrivals[gains[0]], constant)
      continue
    }
    if (depends.some((k) => k !== losses[0])) return undefined
    const known = leaving.find(({ from, to }) => from === losses[0] && to === gains[0])
    if (known === undefined) leaving.push({ from: losses[0], to: gains[0], labels: [label] })
    else known.labels.push(label)
  }
  // A copy that does nothing far out must do nothing anywhere near 0 either.
  const idle = copies.filter(({ label }) => !seen.has(label))
  for (const { rule, bound } of idle) {
    const depends = new Set([...occurring(model, rule.when, bound), ...occurring(model, rule.rate, bound)])
    if (rule.then.length > 0 && depends.size > 1) return undefined
  }
  const routing = elements.map(() => elements.map(() => zero))
  const service: CountFunction[] = []
  for (let k = 0; k < elements.length; k++) {
    const own = leaving.filter(({ from }) => from === k)
    if (own.length === 0) return undefined
    const functions = own.map(({ labels }) => countFunction(model, copies, place, k, labels))
    if (functions.some((each) => each === undefined)) return undefined
    const total = (functions as CountFunction[]).reduce(addFunctions)
    for (const [index, each] of (functions as CountFunction[]).entries()) {
      const share = proportion(each, total)
      if (share === undefined) return undefined
      const { to } = own[index]
      if (to !== undefined) routing[k][to] = add(routing[k][to], share)
    }
    if (total.below.slice(1).some((rate) => rate.numerator <= 0n) || total.below[0].numerator !== 0n) return undefined
    service.push(total)
  }
  verify(model, place, { arrivals, routing, service })
  return { arrivals, routing, service }
}

/** The rate of some copies as a function of station k's count; other stations hold enough not to matter. */
function countFunction(
  model: VariablesModel,
  copies: readonly Copy[],
  place: Place,
  k: number,
  labels: readonly number[],
): CountFunction | undefined {
  const element = place.counts[k]
  const single: Place = { counts: [element], outward: [1], values: place.values, modulus: 1, residue: 0 }
  const own = labels.map((label) => copies[label])
  const far = movesAt(model, own, single)
  if (far.level > longestTable) return undefined
  const beyond = Math.max(1, far.level)
  const total = far.moves.map(({ rate }) => rate).reduce(addRationals, rationalOf(zero, 1))
  const below: Fraction[] = []
  const wanted = new Set(labels)
  for (let count = 0; count < beyond; count++) {
    let sum = zero
    for (const { label, rate } of model.expandExactly(stateOf(single, [count]))) {
      if (!wanted.has(label)) continue
      if (rate === undefined) return undefined
      sum = add(sum, rate)
    }
    below.push(sum)
  }
  return { below, beyond, far: total }
}

function addFunctions(a: CountFunction, b: CountFunction): CountFunction {
  const beyond = Math.max(a.beyond, b.beyond)
  const at = (of: CountFunction, count: number): Fraction =>
    count < of.beyond ? of.below[count] : evaluateRational(of.far, [BigInt(count)])
  return {
    beyond,
    below: Array.from({ length: beyond }, (_, count) => add(at(a, count), at(b, count))),
    far: addRationals(a.far, b.far),
  }
}

/** part / whole where that is the same at every count. */
function proportion(part: CountFunction, whole: CountFunction): Fraction | undefined {
  const at = BigInt(whole.beyond + 1)
  const share = divide(evaluateRational(part.far, [at]), evaluateRational(whole.far, [at]))
  if (!sameRational(part.far, multiplyRationals(whole.far, rationalOf(share, 1)))) return undefined
  for (let count = 0; count < whole.beyond; count++) {
    const own = count < part.beyond ? part.below[count] : evaluateRational(part.far, [BigInt(count)])
    if (compare(own, multiply(share, whole.below[count])) !== 0) return undefined
  }
  return share
}

/**
 * Throughputs by the traffic equations, stations in `full` sending on what they serve in place of what they get.
 * @returns undefined where some customers never leave
 */
function solveTraffic(
  arrivals: readonly Fraction[],
  routing: readonly (readonly Fraction[])[],
  full: ReadonlySet<number>,
  served: readonly Fraction[] = [],
): Fraction[] | undefined {
  const n = arrivals.length
  const rows = arrivals.map((own, j) => {
    const line = Array.from({ length: n }, (_, i) => (full.has(i) ? zero : subtract(zero, routing[i][j])))
    line[j] = add(line[j], one)
    const fixed = [...full].reduce((sum, i) => add(sum, multiply(served[i], routing[i][j])), own)
    return [...line, fixed]
  })
  for (let column = 0; column < n; column++) {
    const pivot = rows.findIndex((row, k) => k >= column && row[column].numerator !== 0n)
    if (pivot === -1) return undefined
    ;[rows[column], rows[pivot]] = [rows[pivot], rows[column]]
    const lead = rows[column][column]
    rows[column] = rows[column].map((each) => divide(each, lead))
    for (let k = 0; k < n; k++) {
      const factor = rows[k][column]
      if (k === column || factor.numerator === 0n) continue
      rows[k] = rows[k].map((each, j) => subtract(each, multiply(factor, rows[column][j])))
    }
  }
  const solution = rows.map((row) => row[n])
  return solution.every((each) => sign(each) >= 0) ? solution : undefined
}

/** A station alone with its throughput: Gauss's test on throughput / service(n). */
function judgeStation(throughput: Fraction, service: CountFunction): NetworkStation['recurrence'] {
  if (throughput.numerator === 0n) return 'positive recurrent'
  const order = orderOf(service.far)
  if (order > 0) return 'positive recurrent'
  if (order < 0) return 'overloaded'
  const [limit, slope] = expansionOf(service.far, 0, 2)
  const against = compare(throughput, limit)
  if (against !== 0) return against < 0 ? 'positive recurrent' : 'overloaded'
  // throughput / service(n) = 1 - (slope/limit)/n + …: the weights go like n^(-slope/limit).
  return compare(divide(slope, limit), one) > 0 ? 'positive recurrent' : 'critical'
}

/**
 * Traffic equations with bottlenecks (Goodman and Massey 1984): each station sends on what it gets or what it can
 * serve. From all stations full downwards: one that gets less than it serves is none, and then sends on less.
 * @returns undefined where no station gets more than it can serve
 */
function bottleneckSpeeds(flows: Flows, names: readonly string[]): Prediction[] | undefined {
  const capacity = flows.service.map(({ far }) => (orderOf(far) > 0 ? undefined : expansionOf(far, 0, 1)[0]))
  if (flows.service.some(({ far }) => orderOf(far) < 0)) return undefined
  const served = capacity.map((each) => each ?? zero)
  const full = new Set(capacity.flatMap((each, k) => (each === undefined ? [] : [k])))
  for (;;) {
    const input = solveTraffic(flows.arrivals, flows.routing, full, served)
    if (input === undefined) return undefined
    const relieved = [...full].filter((k) => compare(input[k], served[k]) < 0)
    for (const k of relieved) full.delete(k)
    if (relieved.length > 0) continue
    const speeds = input.map((each, k) => (full.has(k) ? subtract(each, served[k]) : zero))
    if (speeds.every((each) => each.numerator === 0n)) return undefined
    return names.map((name, k) => ({
      name: `speed_${name}`,
      value: toNumber(speeds[k]),
      exact: speeds[k],
      means: `limit of ${name}(t) / t`,
      source: 'Chen and Mandelbaum 1991 (from memory)',
    }))
  }
}

/** Holds the network as it was read against the model's own moves in many states. */
function verify(model: VariablesModel, place: Place, flows: Flows): void {
  const at = (of: CountFunction, count: number): Fraction =>
    count < of.beyond ? of.below[count] : evaluateRational(of.far, [BigInt(count)])
  const n = place.counts.length
  const probes: number[][] = [new Array<number>(n).fill(0)]
  let seed = 12345
  const next = (below: number): number => {
    seed = (seed * 1103515245 + 12345) % 2147483648
    return Math.floor((seed / 2147483648) * below)
  }
  for (let k = 0; k < 40; k++)
    probes.push(Array.from({ length: n }, () => (next(3) === 0 ? 0 : next(k < 25 ? 6 : 3000))))
  for (let k = 0; k < n; k++) probes.push(Array.from({ length: n }, (_, i) => (i === k ? 3 : 0)))
  for (const counts of probes) {
    const wanted = new Map<string, Fraction>()
    const put = (gain: number | undefined, loss: number | undefined, rate: Fraction): void => {
      if (rate.numerator === 0n || gain === loss) return
      const moved = counts.map((each, k) => each + (k === gain ? 1 : 0) - (k === loss ? 1 : 0))
      const key = stateOf(place, moved).join(' ')
      wanted.set(key, add(wanted.get(key) ?? zero, rate))
    }
    for (const [k, rate] of flows.arrivals.entries()) put(k, undefined, rate)
    counts.forEach((count, k) => {
      const rate = at(flows.service[k], count)
      let out = one
      flows.routing[k].forEach((share, j) => {
        out = subtract(out, share)
        put(j, k, multiply(rate, share))
      })
      put(undefined, k, multiply(rate, out))
    })
    const here = stateOf(place, counts)
    const key = here.join(' ')
    for (const { rate, next: after } of model.expandExactly(here)) {
      if (rate === undefined) throw new NotFollowed('a rate is not known exactly')
      const target = after.join(' ')
      if (target !== key) wanted.set(target, subtract(wanted.get(target) ?? zero, rate))
    }
    if ([...wanted.values()].some((rest) => rest.numerator !== 0n)) {
      throw new NotFollowed('the moves are not exactly those of a network of stations')
    }
  }
}
