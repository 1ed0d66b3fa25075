/**
 * A set of integer vectors, numbered in the order in which they were added: open addressing with linear probing over
 * typed arrays, the vectors themselves in one flat array.
 */
export interface PackedStates {
  readonly count: number
  /** count × width (and room beyond), row-major. */
  readonly values: Int32Array
  /**
   * The number of a vector, given as `width` numbers from `at` on; a new one is added.
   * @returns -1 where a number does not fit 32 bits
   */
  indexOf(source: Float64Array, at: number): number
}

export function newPackedStates(width: number): PackedStates {
  let capacity = 1 << 12
  let mask = capacity - 1
  let slots = new Int32Array(capacity).fill(-1)
  let values = new Int32Array((capacity >> 1) * width)
  let count = 0

  /** Mixes as in the finalizer of MurmurHash3 (Appleby, public domain; constants from memory). */
  const hashOf = (row: Int32Array, at: number): number => {
    let hash = 0x9e3779b9
    for (let i = 0; i < width; i++) {
      hash = Math.imul(hash ^ row[at + i], 0x85ebca6b)
      hash ^= hash >>> 13
    }
    hash = Math.imul(hash, 0xc2b2ae35)
    return (hash ^ (hash >>> 16)) >>> 0
  }

  const enlarge = (): void => {
    capacity *= 2
    mask = capacity - 1
    slots = new Int32Array(capacity).fill(-1)
    const larger = new Int32Array((capacity >> 1) * width)
    larger.set(values.subarray(0, count * width))
    values = larger
    for (let index = 0; index < count; index++) {
      let slot = hashOf(values, index * width) & mask
      while (slots[slot] >= 0) slot = (slot + 1) & mask
      slots[slot] = index
    }
  }

  const indexOf = (source: Float64Array, at: number): number => {
    if (count * 2 >= capacity) enlarge()
    // The vector is written where it would stand: if it is known, the next one overwrites it.
    const base = count * width
    for (let i = 0; i < width; i++) {
      const value = source[at + i]
      values[base + i] = value
      if (values[base + i] !== value) return -1
    }
    let slot = hashOf(values, base) & mask
    for (;;) {
      const index = slots[slot]
      if (index < 0) break
      const other = index * width
      let same = true
      for (let i = 0; i < width; i++) {
        if (values[other + i] !== values[base + i]) {
          same = false
          break
        }
      }
      if (same) return index
      slot = (slot + 1) & mask
    }
    slots[slot] = count
    return count++
  }

  return {
    get count() {
      return count
    },
    get values() {
      return values
    },
    indexOf,
  }
}
