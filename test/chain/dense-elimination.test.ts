import { describe, expect, test } from 'vitest'
import { eliminateLeading } from '../../src/chain/dense-elimination.js'
import { type SimdProducts, simdProducts } from '../../src/chain/simd-products.js'

const matrixOf = (size: number, seed: number): Float64Array => {
  let state = seed
  return Float64Array.from({ length: size * size }, () => {
    state = (Math.imul(state, 1103515245) + 12345) & 0x7fffffff
    return 2 ** ((state / 0x80000000) * 40 - 20)
  })
}

/** The slow, obvious version. */
function plainly(a: Float64Array, size: number, pivots: number): void {
  for (let k = 0; k < pivots; k++) {
    let leaving = 0
    for (let j = k + 1; j < size; j++) leaving += a[k * size + j]
    for (let i = k + 1; i < size; i++) {
      a[i * size + k] /= leaving
      for (let j = k + 1; j < size; j++) a[i * size + j] += a[i * size + k] * a[k * size + j]
    }
  }
}

const names = (size: number) => Int32Array.from({ length: size }, (_, k) => k)

describe.each([5, 16, 63, 64, 65, 130])('a dense matrix of %i states', (size) => {
  test.each([1, size >> 1, size - 1])('loses %i states as by the plain loop', (pivots) => {
    const blocked = matrixOf(size, size)
    const plain = blocked.slice()
    expect(eliminateLeading(blocked, size, pivots, names(size), new Float64Array(pivots), 0)).toBe(pivots)
    plainly(plain, size, pivots)
    for (let i = 0; i < size; i++) {
      // The diagonal means nothing.
      for (let j = 0; j < size; j++) if (i !== j) expect(blocked[i * size + j] / plain[i * size + j]).toBeCloseTo(1, 11)
    }
  })

  test('vector instructions give the very digits of the plain kernel', () => {
    const simd = simdProducts() as SimdProducts
    const plain = matrixOf(size, 3 * size)
    const vector = simd.matrix(size * size)
    vector.set(plain)
    const leaving = [new Float64Array(size), new Float64Array(size)]
    eliminateLeading(plain, size, size - 2, names(size), leaving[0], 0)
    eliminateLeading(vector, size, size - 2, names(size), leaving[1], 0, simd)
    expect(vector).toEqual(plain)
    expect(leaving[1]).toEqual(leaving[0])
  })
})

test('a state that can hardly leave stays behind the others', () => {
  const a = Float64Array.from([0, 1e-200, 1e-200, 1, 0, 1, 1, 1, 0])
  const indices = names(3)
  expect(eliminateLeading(a, 3, 2, indices, new Float64Array(2), 1e-150)).toBe(1)
  expect([...indices]).toEqual([1, 0, 2])
})

test('a matrix of another memory is left to the plain kernel', () => {
  const simd = simdProducts() as SimdProducts
  expect(simd.add(new Float64Array(64), 8, 0, 2, 2, 2)).toBe(false)
})
