/** Sums of one batch a column: those of the present piece, and the batch's so far with what rounding lost of it. */
export interface BatchSums {
  readonly piece: Float64Array
  readonly sum: Float64Array
  readonly lost: Float64Array
}

export const newBatchSums = (columns: number): BatchSums => ({
  piece: new Float64Array(columns),
  sum: new Float64Array(columns),
  lost: new Float64Array(columns),
})

/**
 * Adds the piece and clears it. Pieces are short (at most 2¹⁸ events) and joined with compensation (Neumaier 1974, from
 * memory), so that a batch of 10⁹ events keeps its digits.
 */
export function addPiece({ piece, sum, lost }: BatchSums): void {
  for (let k = 0; k < sum.length; k++) {
    const total = sum[k] + piece[k]
    lost[k] += Math.abs(sum[k]) >= Math.abs(piece[k]) ? sum[k] - total + piece[k] : piece[k] - total + sum[k]
    sum[k] = total
  }
  piece.fill(0)
}

/** Writes the means of the batch from `at` on and begins the next one. */
export function closeBatch({ sum, lost }: BatchSums, length: number, means: Float64Array, at: number): void {
  for (let k = 0; k < sum.length; k++) means[at + k] = (sum[k] + lost[k]) / length
  sum.fill(0)
  lost.fill(0)
}
