import { expect, test } from 'vitest'
import { varianceConstant } from '../../src/dynamics/variance-constant.js'
import { chainOfArcs } from './chain-of-arcs.js'

// Relative values of the indicator of state 1, by hand: g(1) - g(0) = 1/(p + q), in either time.
// Constants from references/variance-constants.json: Kemeny and Snell 1960, section 4.6, pq(2 - p - q)/(p + q)³;
// Whitt 1992, 2ab/(a + b)³.
test('two states in discrete time, 0.1 and 0.3: 0.75', () => {
  const chain = chainOfArcs('discrete', 2, [
    [0, 0, 0.9],
    [0, 1, 0.1],
    [1, 0, 0.3],
    [1, 1, 0.7],
  ])
  expect(varianceConstant(chain, Float64Array.of(0.75, 0.25), Float64Array.of(0, 1 / 0.4))).toBeCloseTo(0.75, 13)
})

test('two states in continuous time, 0.1 and 0.3: 0.9375', () => {
  const chain = chainOfArcs('continuous', 2, [
    [0, 1, 0.1],
    [1, 0, 0.3],
  ])
  expect(varianceConstant(chain, Float64Array.of(0.75, 0.25), Float64Array.of(0, 1 / 0.4))).toBeCloseTo(0.9375, 13)
})

test('firings of a Poisson stream: the variance is the rate', () => {
  const chain = chainOfArcs('continuous', 1, [[0, 0, 9]])
  expect(varianceConstant(chain, Float64Array.of(1), Float64Array.of(0), Float64Array.of(1))).toBe(9)
})

test('firings of a coin: p(1 - p) a step', () => {
  const chain = chainOfArcs('discrete', 1, [
    [0, 0, 0.25],
    [0, 0, 0.75],
  ])
  expect(varianceConstant(chain, Float64Array.of(1), Float64Array.of(0), Float64Array.of(1, 0))).toBeCloseTo(0.1875, 15)
})

test('a failure counted once a cycle: the renewal rate times the squared variation of the cycle', () => {
  // Cycle = up time + down time, means 1/a and 1/b: variance constant m⁻³ (1/a² + 1/b²), m = 1/a + 1/b
  // (Cox 1962, renewal theory, from memory).
  const [a, b] = [0.1, 0.3]
  const m = 1 / a + 1 / b
  const chain = chainOfArcs('continuous', 2, [
    [0, 1, a],
    [1, 0, b],
  ])
  // -Q g = a·1{0} - 1/m: in state 1, -b(g(0) - g(1)) = -1/m, so g(0) - g(1) = 1/(mb).
  const found = varianceConstant(
    chain,
    Float64Array.of(0.75, 0.25),
    Float64Array.of(1 / (m * b), 0),
    Float64Array.of(1, 0),
  )
  expect(found).toBeCloseTo((1 / a ** 2 + 1 / b ** 2) / m ** 3, 13)
})
