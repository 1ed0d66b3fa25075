import fc from 'fast-check'
import { describe, expect, test } from 'vitest'
import { exponential, layerDensity, layerEnd, tailStart } from '../../src/simulation/exponential.js'
import { streamFrom, streamOf } from '../../src/simulation/random-stream.js'

describe('the generator', () => {
  // The published recurrence of xoshiro128++ (Blackman and Vigna 2021, from memory) in BigInt, modulo 2^32.
  function* published(state: readonly number[]): Generator<number> {
    const mask = 0xffffffffn
    const rotated = (x: bigint, k: bigint) => ((x << k) | (x >> (32n - k))) & mask
    const s = state.map(BigInt)
    for (;;) {
      yield Number((rotated((s[0] + s[3]) & mask, 7n) + s[0]) & mask)
      const t = (s[1] << 9n) & mask
      s[2] ^= s[0]
      s[3] ^= s[1]
      s[1] ^= s[2]
      s[0] ^= s[3]
      s[2] ^= t
      s[3] = rotated(s[3], 11n)
    }
  }

  test('its words are those of the published recurrence, from any state', () =>
    fc.assert(
      fc.property(fc.array(fc.nat(0xffffffff), { minLength: 4, maxLength: 4 }), (state) => {
        const stream = streamFrom(state as [number, number, number, number])
        const expected = published(state)
        for (let k = 0; k < 100; k++) expect(stream.nextWord()).toBe(expected.next().value)
      }),
      { seed: 3, numRuns: 200 },
    ))

  // The first ten words from the state 1, 2, 3, 4, as several ports of the generator test them: from memory.
  test('from the state 1, 2, 3, 4 it gives the known first words', () => {
    const stream = streamFrom([1, 2, 3, 4])
    expect(Array.from({ length: 10 }, () => stream.nextWord())).toEqual([
      641, 1573767, 3222811527, 3517856514, 836907274, 4247214768, 3867114732, 1355841295, 495546011, 621204420,
    ])
  })

  test('a stream goes on from its state with the very next word', () => {
    const stream = streamOf('night-shift-7', 5)
    for (let k = 0; k < 17; k++) stream.nextWord()
    const other = streamFrom(stream.state())
    for (let k = 0; k < 50; k++) expect(other.nextPositive()).toBe(stream.nextPositive())
  })

  test('a uniform is in (0, 1] and a multiple of 2^-53', () => {
    const stream = streamOf('uniform', 0)
    for (let k = 0; k < 100_000; k++) {
      const u = stream.nextPositive()
      expect(u > 0 && u <= 1 && Number.isInteger(u * 2 ** 53)).toBe(true)
    }
  })
})

describe('streams', () => {
  const firstWords = (seed: string, replication: number, purpose?: 'run' | 'pilot') =>
    streamOf(seed, replication, purpose).state().join()

  test('10,000 replications and both purposes have states of their own', () => {
    const states = new Set<string>()
    for (let r = 0; r < 10_000; r++) states.add(firstWords('a', r)).add(firstWords('a', r, 'pilot'))
    expect(states.size).toBe(20_000)
  })

  // Each pair is one that a generator keyed by repeated low bytes would confuse.
  test.each([
    ['a', 'aa'],
    ['x', 'xrun:0:1:x'],
    ['\u0101', '\u0001'],
    ['', ' '],
    ['Ä', 'ä'],
    [`${'long '.repeat(100)}1`, `${'long '.repeat(100)}2`],
  ])('the phrases %j and %j are told apart', (one, other) => {
    expect(firstWords(one, 0)).not.toBe(firstWords(other, 0))
  })

  test('replication 11 of one phrase is not replication 1 of another', () => {
    expect(firstWords('1:a', 1)).not.toBe(firstWords('a', 11))
  })

  // A snapshot, not truth: it notices when the draws of a published seed change.
  test('the first draws of a phrase stay as they were', () => {
    const stream = streamOf('night-shift-7', 0)
    const pilot = streamOf('night-shift-7', 0, 'pilot')
    expect([
      ...Array.from({ length: 4 }, () => stream.nextWord()),
      ...Array.from({ length: 4 }, () => pilot.nextWord()),
    ]).toMatchInlineSnapshot(`
      [
        2599775233,
        273979660,
        1248395404,
        3351298908,
        2081158145,
        468300566,
        2815828195,
        1481778835,
      ]
    `)
  })
})

describe('exponential draws', () => {
  test('all layers have the same area, the lowest with the tail', () => {
    const area = layerEnd[0] * layerDensity[1]
    expect(Math.abs(tailStart * Math.exp(-tailStart) + Math.exp(-tailStart) - area)).toBeLessThan(1e-14)
    for (let i = 1; i < 256; i++) {
      const height = layerDensity[i + 1] - layerDensity[i]
      expect(Math.abs(layerEnd[i] * height - area)).toBeLessThan(1e-12)
    }
    expect(layerEnd[256]).toBe(0)
  })

  // Chi-square on 200 cells of equal probability, 199 degrees of freedom: above 290.6 once in 40,000 such tests
  // (Wilson and Hilferty's approximation), below 121 about as rarely. The last cell begins beyond the core's last layers.
  test('400,000 draws follow 1 - e^-x', () => {
    const cells = 200
    const draws = 400_000
    const counts = new Float64Array(cells)
    const stream = streamOf('goodness of fit', 0)
    for (let k = 0; k < draws; k++) counts[Math.min(cells - 1, Math.floor(-Math.expm1(-exponential(stream)) * cells))]++
    const statistic = counts.reduce((sum, count) => sum + (count - draws / cells) ** 2 / (draws / cells), 0)
    expect(statistic).toBeLessThan(290.6)
    expect(statistic).toBeGreaterThan(121)
  })

  // Beyond the tail's beginning r lie e^-r = 0.000454 of the draws: of 2,000,000 draws 908 ± 30; 5 deviations, 1 in a
  // million. Their excess over r is exponential again: mean 1 ± 1/sqrt(count).
  test('the tail is as heavy as it should be', () => {
    const stream = streamOf('tail', 0)
    const excess: number[] = []
    for (let k = 0; k < 2_000_000; k++) {
      const x = exponential(stream)
      if (x > tailStart) excess.push(x - tailStart)
    }
    const expected = 2_000_000 * Math.exp(-tailStart)
    expect(Math.abs(excess.length - expected)).toBeLessThan(5 * Math.sqrt(expected))
    const mean = excess.reduce((sum, x) => sum + x, 0) / excess.length
    expect(Math.abs(mean - 1)).toBeLessThan(5 / Math.sqrt(excess.length))
  })
})
