import fc from 'fast-check'
import type { Move } from './table-chain.js'

// Random chains of every structure. Rates are doubles, meant exactly, so that the oracle solves the very same chain.

const mildRate = fc.double({ min: 0.01, max: 10, noNaN: true })
/** 24 decades. */
const stiffRate = fc
  .tuple(fc.integer({ min: -40, max: 40 }), fc.double({ min: 1, max: 2, noNaN: true }))
  .map(([exponent, mantissa]) => mantissa * 2 ** exponent)
/** Most as mild, some so rare that blocks hardly see each other. */
const looseRate = fc.oneof(
  { arbitrary: mildRate, weight: 3 },
  { arbitrary: mildRate.map((rate) => rate * 1e-11), weight: 1 },
)

export interface RandomChain {
  readonly time: 'continuous' | 'discrete'
  readonly size: number
  readonly moves: readonly Move[]
}

/** A ring makes it irreducible, chords make it interesting; shrinks towards a short bare ring. */
const ringWithChords = (rate: fc.Arbitrary<number>) =>
  fc.integer({ min: 1, max: 12 }).chain((size) =>
    fc
      .record({
        ring: fc.array(rate, { minLength: size, maxLength: size }),
        chords: fc.array(fc.tuple(fc.nat(size - 1), fc.nat(size - 1), rate), { maxLength: 2 * size }),
      })
      .map(({ ring, chords }): RandomChain => {
        const moves = new Map<string, Move>()
        ring.forEach((each, k) => {
          if (size > 1) moves.set(`${k} ${(k + 1) % size}`, [k, (k + 1) % size, each])
        })
        for (const [from, to, each] of chords) {
          if (from !== to && !moves.has(`${from} ${to}`)) moves.set(`${from} ${to}`, [from, to, each])
        }
        return { time: 'continuous', size, moves: [...moves.values()] }
      }),
  )

/** Discrete, of a period of 2 or more: states in layers, every move to the next layer; probabilities in 64ths, exact. */
const layered = fc
  .record({ layers: fc.integer({ min: 2, max: 4 }), width: fc.integer({ min: 1, max: 3 }) })
  .chain(({ layers, width }) =>
    fc
      .array(fc.array(fc.integer({ min: 1, max: 63 }), { minLength: width - 1, maxLength: width - 1 }), {
        minLength: layers * width,
        maxLength: layers * width,
      })
      .map((cuts): RandomChain => {
        const moves = cuts.flatMap((own, state): Move[] => {
          const ends = [0, ...own.toSorted((a, b) => a - b), 64]
          const next = ((Math.floor(state / width) + 1) % layers) * width
          return ends
            .slice(1)
            .flatMap((end, k): Move[] => (end > ends[k] ? [[state, next + k, (end - ends[k]) / 64]] : []))
        })
        return { time: 'discrete', size: layers * width, moves }
      }),
  )

export const irreducible: Readonly<Record<string, fc.Arbitrary<RandomChain>>> = {
  mild: ringWithChords(mildRate),
  stiff: ringWithChords(stiffRate),
  'nearly decomposable': ringWithChords(looseRate),
}

/** Every layer's states may be reached or not: the chain can have transient states. */
export const periodic = layered

/** Any directed graph, rates mild: several closed classes, transient states, states the start can't reach. */
export const anyChain = fc.integer({ min: 1, max: 10 }).chain((size) =>
  fc
    .array(fc.tuple(fc.nat(size - 1), fc.nat(size - 1), fc.integer({ min: 1, max: 8 })), { maxLength: 2 * size })
    .map((arcs): RandomChain => {
      const moves = new Map<string, Move>()
      for (const [from, to, rate] of arcs) if (from !== to) moves.set(`${from} ${to}`, [from, to, rate])
      return { time: 'continuous', size, moves: [...moves.values()] }
    }),
)
