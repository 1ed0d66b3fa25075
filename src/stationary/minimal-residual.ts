/** A linear map of vectors, given by what it does; the argument is not changed. */
export type LinearMap = (vector: Float64Array) => Float64Array

/** Vectors kept before a restart. */
const restart = 25

/**
 * An approximate solution x = M y of A x = b by the generalised minimal residual method, preconditioned from the right.
 *
 * Source: Saad and Schultz 1986 (from memory). Nothing is taken on trust from it: the caller judges x by its residual.
 *
 * @param wanted part of the first residual's length at which it stops
 * @param most products with A at most
 */
export function minimalResidual(
  A: LinearMap,
  M: LinearMap,
  b: Float64Array,
  wanted: number,
  most: number,
): Float64Array {
  const n = b.length
  const x = new Float64Array(n)
  const goal = wanted * length(b)
  let products = 0
  let last = Number.POSITIVE_INFINITY
  while (products < most) {
    const residual = A(x)
    for (let i = 0; i < n; i++) residual[i] = b[i] - residual[i]
    const start = length(residual)
    // Rounding ends the gain of restarts: nothing is left to win.
    if (!(start > goal) || !(start < 0.5 * last)) break
    last = start
    const basis = [scaled(residual, 1 / start)]
    const columns: Float64Array[] = []
    const turns: [cosine: number, sine: number][] = []
    const right = new Float64Array(restart + 1)
    right[0] = start
    let size = 0
    while (size < restart && products < most) {
      const next = A(M(basis[size]))
      products++
      const column = new Float64Array(size + 2)
      for (let k = 0; k <= size; k++) {
        const part = dot(next, basis[k])
        column[k] = part
        for (let i = 0; i < n; i++) next[i] -= part * basis[k][i]
      }
      const left = length(next)
      column[size + 1] = left
      for (let k = 0; k < size; k++) turn(column, k, turns[k])
      const radius = Math.hypot(column[size], left)
      if (!(radius > 0)) break
      turns.push([column[size] / radius, left / radius])
      turn(column, size, turns[size])
      turn(right, size, turns[size])
      columns.push(column)
      size++
      if (Math.abs(right[size]) <= goal || left === 0) break
      basis.push(scaled(next, 1 / left))
    }
    const y = new Float64Array(size)
    for (let k = size - 1; k >= 0; k--) {
      let sum = right[k]
      for (let j = k + 1; j < size; j++) sum -= columns[j][k] * y[j]
      y[k] = sum / columns[k][k]
    }
    const combined = new Float64Array(n)
    for (let k = 0; k < size; k++) for (let i = 0; i < n; i++) combined[i] += y[k] * basis[k][i]
    const step = M(combined)
    for (let i = 0; i < n; i++) x[i] += step[i]
  }
  return x
}

const length = (vector: Float64Array): number => Math.sqrt(dot(vector, vector))

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0
  for (let i = 0; i < a.length; i++) sum += a[i] * b[i]
  return sum
}

const scaled = (vector: Float64Array, by: number): Float64Array => vector.map((each) => each * by)

function turn(values: Float64Array, k: number, [cosine, sine]: readonly [number, number]): void {
  const upper = cosine * values[k] + sine * values[k + 1]
  values[k + 1] = cosine * values[k + 1] - sine * values[k]
  values[k] = upper
}
