/**
 * Period of one closed class: the greatest common divisor of level(u) + 1 - level(v) over its arcs (u, v), the levels
 * being those of a breadth-first search from any of its states.
 *
 * Source: Denardo 1977 (from memory).
 *
 * @param states of the class; no arc leaves them and each reaches all
 * @param level workspace of length n; those of `states` are overwritten
 * @cost linear in the states and arcs of the class
 */
export function periodOf(rowStart: Int32Array, target: Int32Array, states: Int32Array, level: Int32Array): number {
  for (const state of states) level[state] = -1
  const queue = new Int32Array(states.length)
  let tail = 1
  queue[0] = states[0]
  level[states[0]] = 0
  let period = 0
  for (let k = 0; k < tail; k++) {
    const state = queue[k]
    for (let arc = rowStart[state]; arc < rowStart[state + 1]; arc++) {
      const head = target[arc]
      if (level[head] === -1) {
        level[head] = level[state] + 1
        queue[tail++] = head
      } else if (period !== 1) period = greatestCommonDivisor(period, Math.abs(level[state] + 1 - level[head]))
    }
  }
  return period
}

function greatestCommonDivisor(a: number, b: number): number {
  while (b !== 0) [a, b] = [b, a % b]
  return a
}
