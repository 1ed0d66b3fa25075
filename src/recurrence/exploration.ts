import { newMoves } from '../model/compile.js'
import type { VariablesModel } from '../model/model.js'

/** States that were listed from the start, breadth first, with all moves out of those that were expanded. */
export interface Exploration {
  /** State vectors in the order found; the start is 0. */
  readonly states: readonly (readonly number[])[]
  readonly indexOf: ReadonlyMap<string, number>
  /** Heads of the arcs out of each state, without those that stay; empty where it was not expanded. */
  readonly heads: readonly (readonly number[])[]
  readonly expanded: readonly boolean[]
  /** Some move leaves the state as it is (with a positive probability). */
  readonly stays: readonly boolean[]
  /** True where every state inside the limits was expanded. */
  readonly complete: boolean
}

export const keyOf = (state: readonly number[]): string => state.join(' ')

/**
 * Lists states from the start. States for which `inside` is false are listed but not expanded.
 * @param maxStates at which listing stops, `complete` is then false
 */
export function exploreWithin(
  model: VariablesModel,
  inside: (state: readonly number[]) => boolean,
  maxStates: number,
): Exploration {
  const { width } = model
  const start = Array.from(model.start)
  const states: number[][] = [start]
  const indexOf = new Map([[keyOf(start), 0]])
  const heads: number[][] = []
  const expanded: boolean[] = []
  const stays: boolean[] = []
  const moves = newMoves(width)
  let complete = true
  for (let k = 0; k < states.length; k++) {
    const here = states[k]
    heads.push([])
    expanded.push(false)
    stays.push(false)
    if (!inside(here)) continue
    if (states.length >= maxStates) {
      complete = false
      continue
    }
    expanded[k] = true
    model.expand(here, moves)
    for (let move = 0; move < moves.count; move++) {
      if (!(moves.rate[move] > 0)) continue
      const { next } = moves
      const from = move * width
      let key = `${next[from]}`
      for (let element = 1; element < width; element++) key += ` ${next[from + element]}`
      let index = indexOf.get(key)
      if (index === undefined) {
        index = states.length
        indexOf.set(key, index)
        const state: number[] = []
        for (let element = 0; element < width; element++) state.push(next[from + element])
        states.push(state)
      }
      if (index === k) stays[k] = true
      else if (!heads[k].includes(index)) heads[k].push(index)
    }
  }
  return { states, indexOf, heads, expanded, stays, complete }
}

/** From where the targets can be reached, in the arcs listed; length of the exploration. */
export function reaching(exploration: Exploration, isTarget: (index: number) => boolean): Uint8Array {
  const size = exploration.states.length
  const tails: number[][] = Array.from({ length: size }, () => [])
  exploration.heads.forEach((heads, from) => {
    for (const to of heads) tails[to].push(from)
  })
  const marked = new Uint8Array(size)
  const queue: number[] = []
  for (let k = 0; k < size; k++) {
    if (!isTarget(k)) continue
    marked[k] = 1
    queue.push(k)
  }
  for (let k = 0; k < queue.length; k++) {
    for (const tail of tails[queue[k]]) {
      if (marked[tail] === 1) continue
      marked[tail] = 1
      queue.push(tail)
    }
  }
  return marked
}

/** Compressed rows of the listed arcs. */
export function compressed(heads: readonly (readonly number[])[]): { rowStart: Int32Array; target: Int32Array } {
  const rowStart = new Int32Array(heads.length + 1)
  heads.forEach((row, k) => {
    rowStart[k + 1] = rowStart[k] + row.length
  })
  return { rowStart, target: Int32Array.from(heads.flat()) }
}

/**
 * Elements that seem to grow without end, with the directions: the candidates for counts. What follows from them is
 * proved elsewhere, so that a wrong guess costs an answer, never a wrong one.
 */
export function growingElements(
  model: VariablesModel,
  sample: Exploration,
): { element: number; up: boolean; down: boolean }[] {
  const found: { element: number; up: boolean; down: boolean }[] = []
  const { states } = sample
  const early = Math.floor(states.length / 2)
  for (let element = 0; element < model.width; element++) {
    if (Number.isFinite(model.lower[element]) && Number.isFinite(model.upper[element])) continue
    let [earlyHigh, earlyLow, high, low] = [-Infinity, Infinity, -Infinity, Infinity]
    states.forEach((state, k) => {
      const value = state[element]
      if (k < early) {
        earlyHigh = Math.max(earlyHigh, value)
        earlyLow = Math.min(earlyLow, value)
      }
      high = Math.max(high, value)
      low = Math.min(low, value)
    })
    const up = !Number.isFinite(model.upper[element]) && high > earlyHigh
    const down = !Number.isFinite(model.lower[element]) && low < earlyLow
    if (up || down) found.push({ element, up, down })
  }
  return found
}
