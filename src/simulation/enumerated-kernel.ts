import { addPiece, type BatchSums, closeBatch, newBatchSums } from './batch-sums.js'
import { layerDensity, layerEnd, tailStart } from './exponential.js'
import { stateOf } from './random-stream.js'
import { beginOf, borderOf, firstStretch, lengthOf } from './run-clock.js'
import type { EnumeratedTask } from './task.js'

/** Events in one piece: about ten milliseconds, and sums so short that rounding does not gather in them. */
const chunk = 2 ** 18

/** Where a replication stands; the loops change it. */
interface Walk {
  readonly random: Int32Array
  state: number
  events: number
  /** Continuous time: what is left of the stretch; and of the holding time in `state`, -1 where it is not drawn yet. */
  left: number
  holding: number
  /** Discrete time: steps from the start, and the part of the present step that lies in earlier stretches. */
  step: number
  used: number
}

/** Time in each state and firings of each arc since they were last added to the sums. */
interface Tally {
  readonly timeIn: Float64Array
  readonly fired: Int32Array
  /** States and arcs that have any, so that a chunk costs no more than what it visited. */
  readonly states: Int32Array
  readonly arcs: Int32Array
  stateCount: number
  arcCount: number
}

/**
 * One replication of an enumerated chain; yields every few milliseconds, so that the caller can look at its clock.
 *
 * The draws of an event depend on the state alone: a holding time in continuous time (two words, more in 1 of 90), then
 * two words for the choice where more than one arc leaves. Batches and warm-up do not bear on the path: a holding time
 * that crosses a border is split there, and nothing is drawn anew. A firing at the border's very instant belongs to
 * the later batch in continuous time (it has probability 0); the firing that ends step t is one of step t.
 */
export function* replicateEnumerated(task: EnumeratedTask, replication: number): Generator<void, void> {
  const { settings, output, maxEvents } = task
  const { batches } = settings
  const continuous = task.time === 'continuous'
  const walk: Walk = {
    random: stateOf(settings.seed, replication, task.purpose),
    state: task.start,
    events: 0,
    left: 0,
    holding: -1,
    step: 0,
    used: 0,
  }
  const tally = newTally(task)
  const sums = newBatchSums(task.valueColumns + task.firingColumns)
  const total = settings.warmUp + settings.runLength
  const timeSoFar = (stretch: number) =>
    continuous ? beginOf(settings, stretch) + lengthOf(settings, stretch) - walk.left : walk.step
  for (let stretch = firstStretch(settings); stretch < batches; stretch++) {
    walk.left = lengthOf(settings, stretch)
    for (let ended = false; !ended; ) {
      const events = Math.min(chunk, maxEvents - walk.events)
      if (events <= 0) {
        output.stoppedAt[replication] = timeSoFar(stretch)
        finish(task, replication, walk)
        return
      }
      ended = continuous
        ? walkInContinuousTime(task, walk, tally, events)
        : walkInSteps(task, walk, tally, events, borderOf(settings, stretch))
      addUp(task, tally, sums, replication, stretch)
      output.events[replication] = walk.events
      output.fraction[replication] = timeSoFar(stretch) / total
      yield
    }
    const row = (replication * batches + stretch) * sums.sum.length
    if (stretch < 0) continue
    closeBatch(sums, lengthOf(settings, stretch), output.means, row)
    output.completed[replication] = stretch + 1
  }
  finish(task, replication, walk)
}

function finish({ output }: EnumeratedTask, replication: number, walk: Walk) {
  output.events[replication] = walk.events
  output.fraction[replication] = 1
  output.endState[replication] = walk.state
}

const newTally = ({ rowStart, target }: EnumeratedTask): Tally => ({
  timeIn: new Float64Array(rowStart.length - 1),
  fired: new Int32Array(target.length),
  // Two more: the state at a border may be noted with a time of 0, and then again.
  states: new Int32Array(rowStart.length + 1),
  arcs: new Int32Array(target.length),
  stateCount: 0,
  arcCount: 0,
})

/** @returns whether the stretch ended; else `budget` events were made */
function walkInContinuousTime(task: EnumeratedTask, walk: Walk, tally: Tally, budget: number): boolean {
  const { rowStart, target, cutoff, alias, meanHolding } = task
  const { timeIn, fired, states, arcs } = tally
  const { random } = walk
  const ends = layerEnd
  const densities = layerDensity
  const { left } = walk
  let { state, holding } = walk
  let { stateCount, arcCount } = tally
  let s0 = random[0]
  let s1 = random[1]
  let s2 = random[2]
  let s3 = random[3]
  // Time is measured from the start of this piece: short holding times keep their digits in a long stretch.
  let elapsed = 0
  let made = 0
  let ended = false
  while (made < budget) {
    while (holding < 0) {
      // Two words of xoshiro128++, as in `streamFrom`, then the ziggurat, as in `exponential`.
      let sum = (s0 + s3) | 0
      const high = (((sum << 7) | (sum >>> 25)) + s0) | 0
      let shifted = s1 << 9
      s2 ^= s0
      s3 ^= s1
      s1 ^= s2
      s0 ^= s3
      s2 ^= shifted
      s3 = (s3 << 11) | (s3 >>> 21)
      sum = (s0 + s3) | 0
      const low = (((sum << 7) | (sum >>> 25)) + s0) | 0
      shifted = s1 << 9
      s2 ^= s0
      s3 ^= s1
      s1 ^= s2
      s0 ^= s3
      s2 ^= shifted
      s3 = (s3 << 11) | (s3 >>> 21)
      const layer = ((high & 31) << 3) | (low & 7)
      const x = ((high >>> 5) * 67108864 + (low >>> 6) + 1) * 1.1102230246251565e-16 * ends[layer]
      if (x < ends[layer + 1]) {
        holding = x * meanHolding[state]
      } else {
        // As in `outsideTheCore`: written out here, since a call would cost the loop its registers.
        sum = (s0 + s3) | 0
        const nextHigh = (((sum << 7) | (sum >>> 25)) + s0) | 0
        shifted = s1 << 9
        s2 ^= s0
        s3 ^= s1
        s1 ^= s2
        s0 ^= s3
        s2 ^= shifted
        s3 = (s3 << 11) | (s3 >>> 21)
        sum = (s0 + s3) | 0
        const nextLow = (((sum << 7) | (sum >>> 25)) + s0) | 0
        shifted = s1 << 9
        s2 ^= s0
        s3 ^= s1
        s1 ^= s2
        s0 ^= s3
        s2 ^= shifted
        s3 = (s3 << 11) | (s3 >>> 21)
        const u = ((nextHigh >>> 5) * 67108864 + (nextLow >>> 6) + 1) * 1.1102230246251565e-16
        if (layer === 0) holding = (tailStart - Math.log(u)) * meanHolding[state]
        else if (densities[layer] + u * (densities[layer + 1] - densities[layer]) < Math.exp(-x)) {
          holding = x * meanHolding[state]
        }
      }
    }
    if (timeIn[state] === 0) states[stateCount++] = state
    if (elapsed + holding >= left) {
      const rest = left - elapsed
      timeIn[state] += rest
      holding -= rest
      elapsed = left
      ended = true
      break
    }
    timeIn[state] += holding
    elapsed += holding
    holding = -1
    made++
    let arc = rowStart[state]
    const degree = rowStart[state + 1] - arc
    if (degree > 1) {
      let sum = (s0 + s3) | 0
      const high = (((sum << 7) | (sum >>> 25)) + s0) | 0
      let shifted = s1 << 9
      s2 ^= s0
      s3 ^= s1
      s1 ^= s2
      s0 ^= s3
      s2 ^= shifted
      s3 = (s3 << 11) | (s3 >>> 21)
      sum = (s0 + s3) | 0
      const low = (((sum << 7) | (sum >>> 25)) + s0) | 0
      shifted = s1 << 9
      s2 ^= s0
      s3 ^= s1
      s1 ^= s2
      s0 ^= s3
      s2 ^= shifted
      s3 = (s3 << 11) | (s3 >>> 21)
      const place = ((high >>> 5) * 67108864 + (low >>> 6)) * 1.1102230246251565e-16 * degree
      const slot = place | 0
      arc += slot
      if (place - slot >= cutoff[arc]) arc = alias[arc]
    }
    if (fired[arc]++ === 0) arcs[arcCount++] = arc
    state = target[arc]
  }
  walk.state = state
  walk.holding = holding
  walk.left = left - elapsed
  walk.events += made
  random[0] = s0
  random[1] = s1
  random[2] = s2
  random[3] = s3
  tally.stateCount = stateCount
  tally.arcCount = arcCount
  return ended
}

/** @returns whether the stretch ended; else `budget` steps were made */
function walkInSteps(
  task: EnumeratedTask,
  walk: Walk,
  tally: Tally,
  budget: number,
  border: { readonly whole: number; readonly part: number },
): boolean {
  const { rowStart, target, cutoff, alias } = task
  const { timeIn, fired, states, arcs } = tally
  const { random } = walk
  let { state, used } = walk
  let { stateCount, arcCount } = tally
  let s0 = random[0]
  let s1 = random[1]
  let s2 = random[2]
  let s3 = random[3]
  const steps = Math.min(budget, border.whole - walk.step)
  let made = 0
  while (made < steps) {
    if (timeIn[state] === 0) states[stateCount++] = state
    let arc = rowStart[state]
    const degree = rowStart[state + 1] - arc
    if (degree === 0) {
      // Nothing leads on: all the whole steps of the stretch pass here.
      timeIn[state] += border.whole - walk.step - made - used
      used = 0
      walk.step = border.whole - made
      break
    }
    timeIn[state] += 1 - used
    used = 0
    made++
    if (degree > 1) {
      let sum = (s0 + s3) | 0
      const high = (((sum << 7) | (sum >>> 25)) + s0) | 0
      let shifted = s1 << 9
      s2 ^= s0
      s3 ^= s1
      s1 ^= s2
      s0 ^= s3
      s2 ^= shifted
      s3 = (s3 << 11) | (s3 >>> 21)
      sum = (s0 + s3) | 0
      const low = (((sum << 7) | (sum >>> 25)) + s0) | 0
      shifted = s1 << 9
      s2 ^= s0
      s3 ^= s1
      s1 ^= s2
      s0 ^= s3
      s2 ^= shifted
      s3 = (s3 << 11) | (s3 >>> 21)
      const place = ((high >>> 5) * 67108864 + (low >>> 6)) * 1.1102230246251565e-16 * degree
      const slot = place | 0
      arc += slot
      if (place - slot >= cutoff[arc]) arc = alias[arc]
    }
    if (fired[arc]++ === 0) arcs[arcCount++] = arc
    state = target[arc]
  }
  walk.step += made
  const ended = walk.step === border.whole
  if (ended && border.part > used) {
    if (timeIn[state] === 0) states[stateCount++] = state
    timeIn[state] += border.part - used
    used = border.part
  }
  walk.state = state
  walk.used = used
  walk.events += made
  random[0] = s0
  random[1] = s1
  random[2] = s2
  random[3] = s3
  tally.stateCount = stateCount
  tally.arcCount = arcCount
  return ended
}

/** Adds a piece of the walk to the batch's sums (not in the warm-up) and clears the tally. */
function addUp(task: EnumeratedTask, tally: Tally, sums: BatchSums, replication: number, stretch: number) {
  const { values, valueColumns, group, weights, firingColumns, bins, binValues, binBatches, binTimes } = task
  const { timeIn, fired, states, arcs, stateCount, arcCount } = tally
  if (stretch >= 0) {
    const { piece } = sums
    for (let k = 0; k < stateCount; k++) {
      const time = timeIn[states[k]]
      const row = states[k] * valueColumns
      for (let column = 0; column < valueColumns; column++) piece[column] += values[row + column] * time
    }
    if (firingColumns > 0) {
      for (let k = 0; k < arcCount; k++) {
        const count = fired[arcs[k]]
        const row = group[arcs[k]] * firingColumns
        for (let column = 0; column < firingColumns; column++) {
          piece[valueColumns + column] += weights[row + column] * count
        }
      }
    }
    addPiece(sums)
    for (let h = 0; h < bins.length; h++) {
      const batch = Math.floor((stretch * binBatches[h]) / task.settings.batches)
      const row = (replication * binBatches[h] + batch) * binValues[h].length
      for (let k = 0; k < stateCount; k++) binTimes[h][row + bins[h][states[k]]] += timeIn[states[k]]
    }
  }
  for (let k = 0; k < stateCount; k++) timeIn[states[k]] = 0
  for (let k = 0; k < arcCount; k++) fired[arcs[k]] = 0
  tally.stateCount = 0
  tally.arcCount = 0
}
