import type { SimdProducts } from './simd-products.js'

/** Pivots that are eliminated before the rest of the matrix is brought up to date, so that it is read once for all of them. */
const panelWidth = 32

/** With fewer rows the calls cost more than they save. */
const smallestForSimd = 16

/**
 * Eliminates the leading states of a dense matrix of rates, without subtraction, in place.
 *
 * With k the state that goes and s_k the rate from it to all that are left, a_ij becomes a_ij + (a_ik / s_k) a_kj.
 * Every entry gets its additions in the order of the pivots, so that blocking changes no digit.
 *
 * Source: Grassmann, Taksar and Heyman 1985.
 *
 * @param a size × size, row-major; the diagonal is carried along and means nothing. Afterwards column k holds the shares
 *   a_ik / s_k below row k, row k the rates a_kj right of column k, and the rest the rates among the states left
 * @param pivots number of leading states that may go; the last state of all never does
 * @param indices names of the rows, length size; exchanged along with them
 * @param leaving length at least pivots: s_k is put here
 * @param least a state whose s_k is below this stays (it is moved behind the others): its shares would lose digits to
 *   underflow
 * @param simd kernel for the bulk of the products, used where `a` lies in its memory; changes no digit
 * @returns number of states eliminated
 */
export function eliminateLeading(
  a: Float64Array,
  size: number,
  pivots: number,
  indices: Int32Array,
  leaving: Float64Array,
  least: number,
  simd?: SimdProducts,
): number {
  let candidates = Math.min(pivots, size)
  let done = 0
  while (done < candidates && done < size - 1) {
    const end = Math.min(done + panelWidth, candidates, size - 1)
    let stop = done
    let stuck = false
    for (; stop < end; stop++) {
      const row = stop * size
      for (let q = done; q < stop; q++) {
        const share = a[row + q] / leaving[q]
        a[row + q] = share
        if (share !== 0) for (let j = q + 1, from = q * size; j < size; j++) a[row + j] += share * a[from + j]
      }
      const out = sumOf(a, row + stop + 1, row + size)
      if (!(out >= least)) {
        stuck = true
        break
      }
      leaving[stop] = out
    }
    if (stuck) {
      // Row `stop` has had the panel's updates already; the exchange below happens after all others have, too.
      updateBelow(a, size, done, stop, stop + 1, leaving, simd)
      candidates--
      exchange(a, size, stop, candidates, indices)
    } else updateBelow(a, size, done, stop, stop, leaving, simd)
    done = stop
  }
  return done
}

/** Added up with the rounding errors carried along: `leaving` must not grow worse with the size of the front. */
function sumOf(a: Float64Array, from: number, to: number): number {
  let sum = 0
  let lost = 0
  for (let j = from; j < to; j++) {
    // Both terms are non-negative, so the larger one tells the error without a branch on signs.
    const value = a[j]
    const next = sum + value
    lost += sum >= value ? sum - next + value : value - next + sum
    sum = next
  }
  return sum + lost
}

/** Applies pivots first … stop - 1 to the rows from `below` on. */
function updateBelow(
  a: Float64Array,
  size: number,
  first: number,
  stop: number,
  below: number,
  leaving: Float64Array,
  simd: SimdProducts | undefined,
): void {
  const width = stop - first
  if (width === 0) return
  for (let i = below; i < size; i++) {
    const row = i * size
    for (let q = first; q < stop; q++) {
      const share = a[row + q] / leaving[q]
      a[row + q] = share
      for (let j = q + 1, from = q * size; j < stop; j++) a[row + j] += share * a[from + j]
    }
  }
  if (size - below >= smallestForSimd && simd?.add(a, size, first, width, below, stop)) {
    // Whole blocks of four by four are done; what is left over stands at the right and at the bottom.
    const columns = stop + ((size - stop) & ~3)
    const rows = below + ((size - below) & ~3)
    if (columns < size) for (let i = below; i < size; i++) addToEntries(a, size, first, width, i, columns, size)
    for (let i = rows; i < size; i++) addToEntries(a, size, first, width, i, stop, columns)
  } else addProducts(a, size, first, width, below, stop)
}

/** a_ij += Σ_q a_iq a_qj for i ≥ rows, j ≥ columns and the `width` pivots q from `first` on: four by four at a time. */
function addProducts(a: Float64Array, size: number, first: number, width: number, rows: number, columns: number): void {
  const packed = new Float64Array(width * 4)
  let j = columns
  for (; j + 4 <= size; j += 4) {
    for (let q = 0; q < width; q++) {
      const from = (first + q) * size + j
      packed[4 * q] = a[from]
      packed[4 * q + 1] = a[from + 1]
      packed[4 * q + 2] = a[from + 2]
      packed[4 * q + 3] = a[from + 3]
    }
    let i = rows
    for (; i + 2 <= size; i += 2) {
      const upper = i * size
      const lower = upper + size
      let a0 = a[upper + j]
      let a1 = a[upper + j + 1]
      let a2 = a[upper + j + 2]
      let a3 = a[upper + j + 3]
      let b0 = a[lower + j]
      let b1 = a[lower + j + 1]
      let b2 = a[lower + j + 2]
      let b3 = a[lower + j + 3]
      for (let q = 0, k = 0; q < width; q++, k += 4) {
        const shareUpper = a[upper + first + q]
        const shareLower = a[lower + first + q]
        const c0 = packed[k]
        const c1 = packed[k + 1]
        const c2 = packed[k + 2]
        const c3 = packed[k + 3]
        a0 += shareUpper * c0
        a1 += shareUpper * c1
        a2 += shareUpper * c2
        a3 += shareUpper * c3
        b0 += shareLower * c0
        b1 += shareLower * c1
        b2 += shareLower * c2
        b3 += shareLower * c3
      }
      a[upper + j] = a0
      a[upper + j + 1] = a1
      a[upper + j + 2] = a2
      a[upper + j + 3] = a3
      a[lower + j] = b0
      a[lower + j + 1] = b1
      a[lower + j + 2] = b2
      a[lower + j + 3] = b3
    }
    for (; i < size; i++) addToEntries(a, size, first, width, i, j, j + 4)
  }
  if (j < size) for (let i = rows; i < size; i++) addToEntries(a, size, first, width, i, j, size)
}

function addToEntries(
  a: Float64Array,
  size: number,
  first: number,
  width: number,
  i: number,
  from: number,
  to: number,
) {
  const row = i * size
  for (let j = from; j < to; j++) {
    let sum = a[row + j]
    for (let q = first; q < first + width; q++) sum += a[row + q] * a[q * size + j]
    a[row + j] = sum
  }
}

/** Exchanges two states: their rows, their columns and their names. */
function exchange(a: Float64Array, size: number, first: number, second: number, indices: Int32Array): void {
  if (first === second) return
  for (let j = 0, p = first * size, q = second * size; j < size; j++, p++, q++) {
    const kept = a[p]
    a[p] = a[q]
    a[q] = kept
  }
  for (let i = 0, row = 0; i < size; i++, row += size) {
    const kept = a[row + first]
    a[row + first] = a[row + second]
    a[row + second] = kept
  }
  const kept = indices[first]
  indices[first] = indices[second]
  indices[second] = kept
}
