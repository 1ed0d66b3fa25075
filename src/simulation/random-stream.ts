import seedrandom from 'seedrandom'

/** All there is to know of a stream: the four 32-bit words of xoshiro128++, unsigned. */
export type StreamState = readonly [number, number, number, number]

export interface RandomStream {
  /** Uniform on the multiples of 2⁻⁵³ in (0, 1]: never 0, so -log(u) is finite. Takes two words. */
  nextPositive(): number
  /** The next 32-bit word of the generator, unsigned. */
  nextWord(): number
  /** `streamFrom(state)` goes on with the very next word. */
  state(): StreamState
}

/** What a stream is for: draws that choose a run's length must not be the draws of the run. */
export type Purpose = 'run' | 'pilot'

/**
 * The draws of one replication: the same phrase and number give the same draws on any worker and machine, after any
 * resumption. Streams of other phrases, replications and purposes are distinct but for a chance of about 2⁻¹²⁸ a pair;
 * two of them overlap within n draws with a chance of about n·2⁻¹²⁷ (the period is 2¹²⁸ - 1).
 *
 * @param seed any phrase; told apart by its bytes in UTF-8
 * @param replication from 0
 */
export function streamOf(seed: string, replication: number, purpose: Purpose = 'run'): RandomStream {
  const [a, b, c, d] = stateOf(seed, replication, purpose)
  return streamFrom([a >>> 0, b >>> 0, c >>> 0, d >>> 0])
}

/** The first state of a stream as signed words, as the kernels hold it. */
export function stateOf(seed: string, replication: number, purpose: Purpose): Int32Array {
  const words = seedrandom(keyOf(seed, replication, purpose))
  const state = Int32Array.from({ length: 4 }, () => words.int32())
  // The one state from which the generator does not move.
  if ((state[0] | state[1] | state[2] | state[3]) === 0) state[0] = 1
  return state
}

/**
 * seedrandom reads the low 8 bits of each character and repeats a short key, as ARC4 does. So the phrase goes in as
 * bytes, and its length stands before it: no key is then another one repeated.
 */
function keyOf(seed: string, replication: number, purpose: Purpose): string {
  const bytes = Buffer.from(seed, 'utf8')
  return `${purpose}:${replication}:${bytes.length}:${bytes.toString('latin1')}`
}

/**
 * xoshiro128++ 1.0 of Blackman and Vigna ("Scrambled linear pseudorandom number generators", 2021): 32-bit additions,
 * shifts and rotations only, which is what plain JavaScript does fastest; state 128 bits, period 2¹²⁸ - 1.
 */
export function streamFrom(state: StreamState): RandomStream {
  let [s0, s1, s2, s3] = Int32Array.from(state)
  const nextWord = () => {
    const sum = (s0 + s3) | 0
    const word = (((sum << 7) | (sum >>> 25)) + s0) | 0
    const shifted = s1 << 9
    s2 ^= s0
    s3 ^= s1
    s1 ^= s2
    s0 ^= s3
    s2 ^= shifted
    s3 = (s3 << 11) | (s3 >>> 21)
    return word >>> 0
  }
  return {
    nextWord,
    nextPositive: () => {
      const high = nextWord() >>> 5
      return (high * 2 ** 26 + (nextWord() >>> 6) + 1) * 2 ** -53
    },
    state: () => [s0 >>> 0, s1 >>> 0, s2 >>> 0, s3 >>> 0],
  }
}
