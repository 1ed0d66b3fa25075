/**
 * M = D - A with A ≥ 0 off the diagonal and D such that each row of M sums to its excess ≥ 0: an M-matrix given without its
 * diagonal, so that solving with it adds only numbers of one sign where the right side has one.
 *
 * Source: Grassmann, Taksar and Heyman 1985; as a representation of M-matrices Alfa, Xue and Ye 2002.
 */
export interface Factors {
  readonly size: number
  /** m×m row-major: below the diagonal the rates left to lower states, above it the shares of what comes from higher ones. */
  readonly entries: Float64Array
  /** Rate out of each state at its elimination. */
  readonly leaving: Float64Array
}

/** @param beside A, m×m row-major, the diagonal is not read; not changed */
export function factorise(beside: Float64Array, excess: Float64Array, m: number): Factors {
  const entries = beside.slice()
  const rest = excess.slice()
  const leaving = new Float64Array(m)
  for (let k = m - 1; k >= 0; k--) {
    const row = k * m
    let out = rest[k]
    for (let j = 0; j < k; j++) out += entries[row + j]
    leaving[k] = out
    for (let i = 0; i < k; i++) {
      const at = i * m
      if (entries[at + k] === 0) continue
      const share = entries[at + k] / out
      entries[at + k] = share
      for (let j = 0; j < k; j++) entries[at + j] += share * entries[row + j]
      rest[i] += share * rest[k]
    }
  }
  return { size: m, entries, leaving }
}

/** x with M x = b, in place. */
export function solveInPlace({ size: m, entries, leaving }: Factors, b: Float64Array): void {
  for (let k = m - 1; k > 0; k--) {
    const moved = b[k]
    if (moved !== 0) for (let i = 0; i < k; i++) b[i] += entries[i * m + k] * moved
  }
  for (let k = 0; k < m; k++) {
    let sum = b[k]
    for (let j = 0, at = k * m; j < k; j++) sum += entries[at + j] * b[j]
    b[k] = sum / leaving[k]
  }
}

/** z with z M = w, in place. */
export function solveFromLeftInPlace({ size: m, entries, leaving }: Factors, w: Float64Array): void {
  for (let k = m - 1; k >= 0; k--) {
    w[k] /= leaving[k]
    const each = w[k]
    if (each !== 0) for (let j = 0, at = k * m; j < k; j++) w[j] += each * entries[at + j]
  }
  for (let k = 1; k < m; k++) {
    let sum = w[k]
    for (let i = 0; i < k; i++) sum += w[i] * entries[i * m + k]
    w[k] = sum
  }
}

/** X with M X = B, all m×m row-major. */
export function solveColumns({ size: m, entries, leaving }: Factors, b: Float64Array): Float64Array {
  const x = b.slice()
  for (let k = m - 1; k > 0; k--) {
    for (let i = 0; i < k; i++) {
      const share = entries[i * m + k]
      if (share === 0) continue
      for (let c = 0, to = i * m, from = k * m; c < m; c++) x[to + c] += share * x[from + c]
    }
  }
  for (let k = 0; k < m; k++) {
    const to = k * m
    for (let j = 0; j < k; j++) {
      const rate = entries[to + j]
      if (rate === 0) continue
      for (let c = 0, from = j * m; c < m; c++) x[to + c] += rate * x[from + c]
    }
    for (let c = 0; c < m; c++) x[to + c] /= leaving[k]
  }
  return x
}
