import { expect, test } from 'vitest'
import type { Chain } from '../../src/chain/chain.js'
import { aliasTables } from '../../src/simulation/alias-table.js'
import { exponential } from '../../src/simulation/exponential.js'
import { streamOf } from '../../src/simulation/random-stream.js'
import { simulate } from '../../src/simulation/simulate.js'
import { batchMeansOf } from './batch-figures.js'
import { ringChain } from './hand-made-chain.js'

/** The obvious walk: one batch from the start, one draw after the other through the stream's own functions. */
function slowWalk(chain: Chain, seed: string, length: number) {
  const { cutoff, alias, meanHolding } = aliasTables(chain)
  const stream = streamOf(seed, 0)
  const timeIn = new Array<number>(chain.size).fill(0)
  let state = chain.start
  let now = 0
  let events = 0
  for (;;) {
    const holding = chain.time === 'continuous' ? exponential(stream) * meanHolding[state] : 1
    if (chain.time === 'continuous' ? now + holding >= length : now === length) {
      timeIn[state] += length - now
      return { timeIn, events, state }
    }
    timeIn[state] += holding
    now += holding
    events++
    const first = chain.rowStart[state]
    const place = (stream.nextPositive() - 2 ** -53) * (chain.rowStart[state + 1] - first)
    const slot = first + Math.floor(place)
    state = chain.target[place - Math.floor(place) < cutoff[slot] ? slot : alias[slot]]
  }
}

test.each(['continuous', 'discrete'] as const)(
  'the flat loop in %s time takes the path of the obvious one',
  async (time) => {
    const { model, chain } = ringChain(50, time)
    // 600,000 events: three pieces of the loop, and the ziggurat's tail some 270 times.
    const length = 600_000
    const slow = slowWalk(chain, 'slow and sure', length)
    const settings = { seed: 'slow and sure', replications: 1, warmUp: 0, runLength: length, batches: 1 }
    const observed = await simulate(model, chain, settings, {
      workers: 1,
      classOf: Int32Array.from({ length: 50 }, (_, k) => k),
    })
    expect(observed.events).toBe(slow.events)
    expect(observed.endedIn?.[0]).toBe(slow.state)
    const level = slow.timeIn.reduce((sum, spent, state) => sum + spent * (state % 10), 0) / length
    expect(Math.abs(batchMeansOf(observed, 'level')[0] - level)).toBeLessThan(1e-9)
  },
)
