import { one, zero } from '../numbers/fraction.js'
import type { BirthDeath, NetworkStation, OpenNetwork } from '../recurrence/classification.js'
import { birthDeathShares, type CountShares } from './birth-death.js'
import type { Growth } from './solve-unbounded-growth.js'

/** Unbounded counts that are independent of each other in the long run; all other integers of the state stay as in `base`. */
export interface IndependentCounts {
  readonly base: readonly number[]
  readonly counts: readonly IndependentCount[]
}

export interface IndependentCount {
  readonly element: number
  /** The element is this times the count. */
  readonly outward: 1 | -1
  readonly shares: CountShares
}

/**
 * The stations of an open network in product form: each holds as many as a station on its own would whose arrivals are
 * Poisson with the throughput of the traffic equations.
 *
 * Source: Jackson 1963.
 *
 * @param base a state; the stations' elements in it mean nothing
 */
export function networkCounts(network: OpenNetwork, base: ArrayLike<number>, growth: Growth): IndependentCounts {
  const state = Array.from(base)
  for (const { element } of network.stations) state[element] = 0
  return {
    base: state,
    counts: network.stations.map((station) => ({
      element: station.element,
      outward: 1,
      shares: station.throughput.numerator === 0n ? alwaysEmpty : birthDeathShares(stationAlone(station), growth),
    })),
  }
}

export function birthDeathCounts(process: BirthDeath, growth: Growth): IndependentCounts {
  const { element, outward, state } = process
  return { base: state, counts: [{ element, outward, shares: birthDeathShares(process, growth) }] }
}

/** A station that no arrival reaches. */
const alwaysEmpty: CountShares = { first: 0, share: Float64Array.of(1), relativeError: 0, ratio: 0, vanished: 0 }

function stationAlone({ element, throughput, serviceBelow, beyond, service }: NetworkStation): BirthDeath {
  return {
    form: 'birth-death',
    time: 'continuous',
    element,
    state: [],
    first: 0,
    outward: 1,
    birthBelow: Array.from({ length: beyond }, () => throughput),
    deathBelow: Array.from({ length: beyond }, (_, n) => serviceBelow[n] ?? zero),
    beyond,
    birth: { numerator: [throughput], denominator: [one] },
    death: service,
  }
}
