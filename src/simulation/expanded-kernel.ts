import { StillmarkError } from '../errors/stillmark-error.js'
import type { Moves, VariablesModel } from '../model/model.js'
import { addPiece, type BatchSums, closeBatch, newBatchSums } from './batch-sums.js'
import type { Columns } from './columns.js'
import { exponential } from './exponential.js'
import { tooManyValues } from './histogram-batches.js'
import { type RandomStream, stateOf, streamFrom } from './random-stream.js'
import { beginOf, borderOf, firstStretch, lengthOf } from './run-clock.js'
import type { Task } from './task.js'

/** Events in one piece: a few milliseconds, and under 0.2 s even at 100 microseconds an event. */
const chunk = 2 ** 11
/** Pairs of batch and value that one replication may keep of one measure. */
const pairsKept = 2 ** 22

/** Time at each value, unsorted; one a batch. */
export interface ValueTimes {
  readonly values: Float64Array
  readonly times: Float64Array
}

/**
 * One replication of a model whose states are not enumerated: its moves are worked out anew in each state. Statistics,
 * borders and draws as in `replicateEnumerated`, but the choice is by cumulative rates, in the order of the file.
 *
 * @returns for each histogram and batch completed the time at each value
 * @throws StillmarkError state-too-large beyond 2⁵³, where integers are no longer exact; whatever `expand` throws
 */
export function* replicateExpanded(
  model: VariablesModel,
  columns: Columns,
  task: Task,
  replication: number,
): Generator<void, readonly (readonly ValueTimes[])[]> {
  const { settings, output, maxEvents } = task
  const continuous = task.time === 'continuous'
  const { averages, firings, histograms } = columns
  const width = averages.length + firings.length
  const stream = streamFrom(unsigned(stateOf(settings.seed, replication, task.purpose)))
  const walk = newWalk(model, columns, stream)
  const valueTimes: ValueTimes[][] = histograms.map(() => [])
  const total = settings.warmUp + settings.runLength
  const timeSoFar = (stretch: number) =>
    continuous ? beginOf(settings, stretch) + lengthOf(settings, stretch) - walk.left : walk.step
  const finish = () => {
    output.events[replication] = walk.events
    output.fraction[replication] = 1
    output.endValues.set(walk.state, replication * model.width)
    return valueTimes
  }
  for (let stretch = firstStretch(settings); stretch < settings.batches; stretch++) {
    const length = lengthOf(settings, stretch)
    walk.left = length
    const border = borderOf(settings, stretch)
    for (let ended = false; !ended; ) {
      const events = Math.min(chunk, maxEvents - walk.events)
      if (events <= 0) {
        output.stoppedAt[replication] = timeSoFar(stretch)
        return finish()
      }
      ended = continuous
        ? walkInContinuousTime(model, columns, walk, events)
        : walkInSteps(model, columns, walk, events, border)
      if (stretch >= 0) addPiece(walk.sums)
      else walk.sums.piece.fill(0)
      output.events[replication] = walk.events
      output.fraction[replication] = timeSoFar(stretch) / total
      yield
    }
    if (stretch >= 0) {
      output.completed[replication] = stretch + 1
      closeBatch(walk.sums, length, output.means, (replication * settings.batches + stretch) * width)
      walk.timeAt.forEach((times, h) => {
        valueTimes[h].push({ values: Float64Array.from(times.keys()), times: Float64Array.from(times.values()) })
        walk.pairs[h] += times.size
        if (walk.pairs[h] > pairsKept) throw tooManyValues(columns.histogramNames[h], times.size)
      })
    }
    for (const times of walk.timeAt) times.clear()
  }
  return finish()
}

const unsigned = (words: Int32Array) => [words[0] >>> 0, words[1] >>> 0, words[2] >>> 0, words[3] >>> 0] as const

/** Where a replication stands; see the enumerated kernel. `known`: moves and values are those of the present state. */
interface Walk {
  readonly stream: RandomStream
  readonly state: Float64Array
  readonly moves: Moves
  known: boolean
  /** Sum of the moves' rates. */
  totalRate: number
  readonly averages: Float64Array
  readonly binValues: Float64Array
  events: number
  left: number
  holding: number
  step: number
  used: number
  readonly sums: BatchSums
  readonly timeAt: readonly Map<number, number>[]
  /** Pairs of batch and value so far. */
  readonly pairs: number[]
}

function newWalk(model: VariablesModel, { averages, firings, histograms }: Columns, stream: RandomStream): Walk {
  return {
    stream,
    state: Float64Array.from(model.start),
    moves: {
      count: 0,
      label: new Int32Array(16),
      rate: new Float64Array(16),
      rateError: new Float64Array(16),
      next: new Float64Array(16 * model.width),
    },
    known: false,
    totalRate: 0,
    averages: new Float64Array(averages.length),
    binValues: new Float64Array(histograms.length),
    events: 0,
    left: 0,
    holding: -1,
    step: 0,
    used: 0,
    sums: newBatchSums(averages.length + firings.length),
    timeAt: histograms.map(() => new Map()),
    pairs: histograms.map(() => 0),
  }
}

function walkInContinuousTime(model: VariablesModel, columns: Columns, walk: Walk, budget: number): boolean {
  const { left } = walk
  let elapsed = 0
  let ended = false
  for (let made = 0; made < budget; made++) {
    look(model, columns, walk)
    if (walk.holding < 0) walk.holding = exponential(walk.stream) / walk.totalRate
    if (elapsed + walk.holding >= left) {
      const rest = left - elapsed
      spend(walk, rest)
      walk.holding -= rest
      elapsed = left
      ended = true
      break
    }
    spend(walk, walk.holding)
    elapsed += walk.holding
    walk.holding = -1
    fire(model, columns, walk)
  }
  walk.left = left - elapsed
  return ended
}

function walkInSteps(
  model: VariablesModel,
  columns: Columns,
  walk: Walk,
  budget: number,
  border: { readonly whole: number; readonly part: number },
): boolean {
  for (let made = 0; made < budget && walk.step < border.whole; made++) {
    look(model, columns, walk)
    if (walk.moves.count === 0) {
      spend(walk, border.whole - walk.step - walk.used)
      walk.step = border.whole
    } else {
      spend(walk, 1 - walk.used)
      walk.step++
      fire(model, columns, walk)
    }
    walk.used = 0
  }
  if (walk.step < border.whole) return false
  if (border.part > walk.used) {
    look(model, columns, walk)
    spend(walk, border.part - walk.used)
    walk.used = border.part
  }
  return true
}

/** Works out the moves and values of the present state, once. */
function look(model: VariablesModel, { averages, histograms, histogramNames }: Columns, walk: Walk) {
  if (walk.known) return
  const { state, moves } = walk
  model.expand(state, moves)
  let total = 0
  for (let k = 0; k < moves.count; k++) total += moves.rate[k]
  walk.totalRate = total
  for (let k = 0; k < averages.length; k++) walk.averages[k] = finite(model, state, averages[k].valueOf(state))
  for (let h = 0; h < histograms.length; h++) {
    walk.binValues[h] = finite(model, state, histograms[h].valueOf(state))
    if (walk.timeAt[h].size > pairsKept) throw tooManyValues(histogramNames[h], walk.timeAt[h].size)
  }
  walk.known = true
}

function spend({ averages, binValues, sums, timeAt }: Walk, time: number) {
  for (let k = 0; k < averages.length; k++) sums.piece[k] += averages[k] * time
  for (let h = 0; h < timeAt.length; h++) {
    timeAt[h].set(binValues[h], (timeAt[h].get(binValues[h]) ?? 0) + time)
  }
}

/** Chooses among the moves with chances in the ratio of their rates, and makes it. */
function fire(model: VariablesModel, { averages, firings }: Columns, walk: Walk) {
  const { state, moves, stream, sums } = walk
  const width = state.length
  let chosen = 0
  if (moves.count > 1) {
    let rest = stream.nextPositive() * walk.totalRate - moves.rate[0]
    // Where rounding leaves a rest after the last move, the last one is meant.
    while (rest > 0 && chosen < moves.count - 1) rest -= moves.rate[++chosen]
  }
  const label = moves.label[chosen]
  for (let k = 0; k < firings.length; k++) {
    const firing = firings[k]
    if (firing.kind === 'frequency' && label >= 0) sums.piece[averages.length + k] += firing.weights[label]
  }
  walk.events++
  let changed = false
  for (let k = 0; k < width; k++) {
    const next = moves.next[chosen * width + k]
    if (next !== state[k]) {
      if (!(Math.abs(next) <= Number.MAX_SAFE_INTEGER)) throw stateTooLarge(model.elements[k])
      state[k] = next
      changed = true
    }
  }
  if (changed) walk.known = false
}

function finite(model: VariablesModel, state: ArrayLike<number>, x: number): number {
  if (Number.isFinite(x)) return x
  throw new StillmarkError({
    code: 'not-finite',
    what: `A measure has no finite value in the state ${model.describe(state)}.`,
    next: 'Guard the expression with if(condition, a, b).',
  })
}

const stateTooLarge = (element: string) =>
  new StillmarkError(
    {
      code: 'state-too-large',
      where: { key: `state.${element}` },
      what: `In the simulation "${element}" went beyond 2^53, where integers are no longer exact.`,
      next: 'Shorten the run with --run-length, or give the variable a bound.',
    },
    'limit',
  )
