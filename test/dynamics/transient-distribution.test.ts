import { readFileSync } from 'node:fs'
import { describe, expect, test } from 'vitest'
import { poissonWeights, transientDistribution } from '../../src/dynamics/transient-distribution.js'
import { chainOfArcs } from './chain-of-arcs.js'

const fromState = (size: number, state: number): Float64Array => {
  const from = new Float64Array(size)
  from[state] = 1
  return from
}

describe('a unit that fails and is repaired', () => {
  // p(down at t) = a/(a + b) · (1 - e^-(a + b)t), by solving the two-state forward equation by hand.
  test.each([0, 0.01, 1, 7.5, 400])('is down after %d as the closed form says, to 1e-13', (time) => {
    const [a, b] = [0.1, 0.3]
    const chain = chainOfArcs('continuous', 2, [
      [0, 1, a],
      [1, 0, b],
    ])
    const down = transientDistribution(chain, fromState(2, 0), time)[1]
    const exact = (-a / (a + b)) * Math.expm1(-(a + b) * time)
    expect(Math.abs(down - exact)).toBeLessThanOrEqual(1e-13 * exact)
  })
})

test('the lazy urn of 8 balls approaches its steady state as published', () => {
  // Source: Levin, Peres and Wilmer 2017, section 4.5; values in references/dynamics.json, case lazy-ehrenfest-tv-8.
  const { cases } = JSON.parse(readFileSync('test/published/references/dynamics.json', 'utf8'))
  const { values } = cases.find((each: { id: string }) => each.id === 'lazy-ehrenfest-tv-8')
  const d = 8
  const arcs: [number, number, number][] = []
  for (let k = 0; k <= d; k++) {
    arcs.push([k, k, 1 / 2])
    if (k < d) arcs.push([k, k + 1, (d - k) / d / 2])
    if (k > 0) arcs.push([k, k - 1, k / d / 2])
  }
  const chain = chainOfArcs('discrete', d + 1, arcs)
  const binomial = [1, 8, 28, 56, 70, 56, 28, 8, 1].map((ways) => ways / 256)
  ;[1, 5, 10, 20, 40].forEach((steps, i) => {
    const now = transientDistribution(chain, fromState(d + 1, 0), steps)
    const distance = binomial.reduce((sum, share, k) => sum + Math.abs(share - now[k]), 0) / 2
    expect(Math.abs(distance - Number(values.tv[i]))).toBeLessThan(1e-14)
  })
})

describe('poissonWeights', () => {
  // e^-m m^k / k! multiplied out from k = 0: another route, sound as long as e^-m does not underflow.
  const direct = (mean: number, k: number): number => {
    let product = Math.exp(-mean)
    for (let j = 1; j <= k; j++) product *= mean / j
    return product
  }
  test.each([0.001, 0.5, 1, 3, 24.7, 300])('mean %d: each weight is the Poisson probability', (mean) => {
    const { first, weights } = poissonWeights(mean)
    weights.forEach((weight, i) => {
      expect(Math.abs(weight - direct(mean, first + i))).toBeLessThan(1e-12 * direct(mean, first + i) + 1e-300)
    })
    expect(weights.reduce((a, b) => a + b, 0)).toBeCloseTo(1, 14)
  })
  test('a mean of ten million neither overflows nor takes more than some ten standard deviations', () => {
    const { first, weights } = poissonWeights(1e7)
    expect(weights.length).toBeLessThan(20 * Math.sqrt(1e7))
    const mean = weights.reduce((sum, weight, i) => sum + weight * (first + i), 0)
    expect(Math.abs(mean - 1e7)).toBeLessThan(1e-4)
  })
})
