import { StillmarkError } from '../errors/stillmark-error.js'
import { newMoves } from '../model/compile.js'
import type { Model, TableModel, VariablesModel } from '../model/model.js'
import { toNumber } from '../numbers/fraction.js'
import type { Chain } from './chain.js'
import { newPackedStates } from './packed-states.js'

export interface ExploreOptions {
  /** 5,000,000 by default. */
  readonly maxStates?: number
  /** Memory for states and arcs together; 4 GB by default. */
  readonly maxMemoryBytes?: number
  /** Called now and then with the number of states found; what it throws ends the exploration. */
  readonly onProgress?: (states: number) => void
}

const defaultStates = 5_000_000
const defaultMemory = 4e9
/** Bytes an arc: target, label, rate and its error. */
const arcBytes = 24
const statesBetweenReports = 1 << 14

/**
 * Enumerates a model's states breadth first from its start, state 0; a table has all its declared states, in their
 * order. Arcs stand in the order of the labels, the stay of `remainder: stay` last.
 *
 * @returns arrays in shared memory, so that workers can be handed them
 * @throws StillmarkError too-many-states, memory-limit (limit), and what the model's moves throw
 */
export function explore(model: Model, options: ExploreOptions = {}): Chain {
  return model.kind === 'table' ? tableChain(model, options) : variablesChain(model, options)
}

function variablesChain(model: VariablesModel, options: ExploreOptions): Chain {
  const { maxStates = defaultStates, maxMemoryBytes = defaultMemory, onProgress } = options
  const { width } = model
  const states = newPackedStates(width)
  states.indexOf(model.start, 0)
  const moves = newMoves(width)
  const here = new Float64Array(width)
  let rowStart = new Int32Array(1 << 12)
  let room = 1 << 14
  let target = new Int32Array(room)
  let label = new Int32Array(room)
  let rate = new Float64Array(room)
  let rateError = new Float64Array(room)
  let arcs = 0
  for (let state = 0; state < states.count; state++) {
    const base = state * width
    const { values } = states
    for (let i = 0; i < width; i++) here[i] = values[base + i]
    model.expand(here, moves)
    const { count, next } = moves
    if (arcs + count > room) {
      while (arcs + count > room) room *= 2
      if (room * arcBytes + states.count * (width * 8 + 12) > maxMemoryBytes)
        throw memoryFull(states.count, arcs, maxMemoryBytes)
      target = enlarged(target, room)
      label = enlarged(label, room)
      rate = enlarged(rate, room)
      rateError = enlarged(rateError, room)
    }
    for (let k = 0; k < count; k++) {
      const index = states.indexOf(next, k * width)
      if (index < 0) throw valueTooLarge(model, next, k * width)
      target[arcs] = index
      label[arcs] = moves.label[k]
      rate[arcs] = moves.rate[k]
      rateError[arcs++] = moves.rateError[k]
    }
    if (states.count > maxStates) throw tooManyStates(model, states.values, states.count, maxStates)
    if (state + 2 > rowStart.length) rowStart = enlarged(rowStart, rowStart.length * 2)
    rowStart[state + 1] = arcs
    if (onProgress !== undefined && state % statesBetweenReports === 0) onProgress(states.count)
  }
  const size = states.count
  return {
    time: model.time,
    size,
    start: 0,
    width,
    values: shared(states.values.subarray(0, size * width)),
    elements: model.elements,
    rowStart: shared(rowStart.subarray(0, size + 1)),
    target: shared(target.subarray(0, arcs)),
    rate: shared(rate.subarray(0, arcs)),
    rateError: shared(rateError.subarray(0, arcs)),
    label: shared(label.subarray(0, arcs)),
  }
}

function tableChain(model: TableModel, { maxStates = defaultStates }: ExploreOptions): Chain {
  const size = model.states.length
  if (size > maxStates) {
    throw new StillmarkError(
      {
        code: 'too-many-states',
        what: `The table has ${size.toLocaleString('en-US')} states; at most ${maxStates.toLocaleString('en-US')} are allowed.`,
        next: 'Allow more with --max-states.',
      },
      'limit',
    )
  }
  const { entries } = model
  const rowStart = new Int32Array(size + 1)
  for (const { from } of entries) rowStart[from + 1]++
  for (let i = 0; i < size; i++) rowStart[i + 1] += rowStart[i]
  const rate = Float64Array.from(entries, ({ value }) => toNumber(value))
  return {
    time: model.time,
    size,
    start: model.start,
    width: 0,
    values: new Int32Array(0),
    elements: [],
    names: model.states,
    rowStart: shared(rowStart),
    target: shared(Int32Array.from(entries, ({ to }) => to)),
    rate: shared(rate),
    rateError: shared(rate.map((value, k) => (isExact(entries[k].value, value) ? 0 : value * 2 ** -53 + 5e-324))),
    label: shared(new Int32Array(entries.length).fill(-1)),
  }
}

const isExact = ({ numerator, denominator }: { numerator: bigint; denominator: bigint }, value: number): boolean =>
  Number.isInteger(value)
    ? denominator === 1n && BigInt(value) === numerator
    : denominator < 1n << 60n && (denominator & (denominator - 1n)) === 0n && numerator < 1n << 53n

function enlarged<T extends Int32Array | Float64Array>(old: T, length: number): T {
  const larger = new (old.constructor as new (length: number) => T)(length)
  larger.set(old)
  return larger
}

function shared<T extends Int32Array | Float64Array>(values: T): T {
  const { BYTES_PER_ELEMENT } = values
  const copy = new (values.constructor as new (buffer: SharedArrayBuffer) => T)(
    new SharedArrayBuffer(values.length * BYTES_PER_ELEMENT),
  )
  copy.set(values)
  return copy
}

/** The variable that spread most, those without a bound first: it is what makes the model large. */
function tooManyStates(model: VariablesModel, values: Int32Array, count: number, maxStates: number): StillmarkError {
  const { width, elements, lower, upper } = model
  let grown = 0
  let widest: readonly [boolean, number] = [false, -1]
  let range: readonly [number, number] = [0, 0]
  for (let i = 0; i < width; i++) {
    let low = Number.POSITIVE_INFINITY
    let high = Number.NEGATIVE_INFINITY
    for (let state = 0; state < count; state++) {
      const value = values[state * width + i]
      if (value < low) low = value
      if (value > high) high = value
    }
    const unbounded = !Number.isFinite(lower[i]) || !Number.isFinite(upper[i])
    if ((unbounded && !widest[0]) || (unbounded === widest[0] && high - low > widest[1])) {
      widest = [unbounded, high - low]
      range = [low, high]
      grown = i
    }
  }
  return new StillmarkError(
    {
      code: 'too-many-states',
      what: `The model has more than ${maxStates.toLocaleString('en-US')} states: "${elements[grown]}" has reached the range ${range[0]} to ${range[1]}${widest[0] ? ', and has no bound' : ''}.`,
      next: 'Allow more with --max-states, or narrow its bounds.',
    },
    'limit',
  )
}

const valueTooLarge = (model: VariablesModel, next: Float64Array, at: number): StillmarkError => {
  const index = Array.from({ length: model.width }, (_, i) => i).find((i) => (next[at + i] | 0) !== next[at + i]) ?? 0
  return new StillmarkError({
    code: 'state-too-large',
    what: `"${model.elements[index]}" becomes ${next[at + index]}, beyond the whole numbers that a state can hold.`,
    next: 'Give it bounds, or measure it in larger units.',
  })
}

const memoryFull = (states: number, arcs: number, budget: number): StillmarkError =>
  new StillmarkError(
    {
      code: 'memory-limit',
      what: `${states.toLocaleString('en-US')} states and ${arcs.toLocaleString('en-US')} transitions were found when the memory of ${(budget / 1e9).toPrecision(2)} GB was full.`,
      next: 'Allow more with --max-memory, or make the model smaller.',
    },
    'limit',
  )
