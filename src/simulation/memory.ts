/** Where the arrays of a run lie: in memory that the workers share, or in that of the one thread that there is. */
export interface Memory {
  doubles(length: number): Float64Array
  integers(length: number): Int32Array
  /** The same numbers in such memory; the array itself where it lies there already. */
  hold<A extends Float64Array | Int32Array>(array: A): A
}

export const ownMemory: Memory = {
  doubles: (length) => new Float64Array(length),
  integers: (length) => new Int32Array(length),
  hold: (array) => array,
}

export const sharedMemory: Memory = {
  doubles: (length) => new Float64Array(new SharedArrayBuffer(8 * length)),
  integers: (length) => new Int32Array(new SharedArrayBuffer(4 * length)),
  hold: (array) => {
    if (array.buffer instanceof SharedArrayBuffer) return array
    const copy =
      array instanceof Float64Array ? sharedMemory.doubles(array.length) : sharedMemory.integers(array.length)
    copy.set(array)
    return copy as typeof array
  },
}
