import { StillmarkError } from '../errors/stillmark-error.js'
import type { LevelStructure } from '../recurrence/classification.js'

/**
 * Proof that the levels of a quasi-birth-death process fall geometrically, with its constant: the long-run share of all
 * levels from k on is at most `constant` · `base`^-k.
 *
 * With V = base^level · v(phase), 1 on the boundary, the mean change of V per time unit is at most -γV from level 1 on and
 * at most b - γV below; so the long-run mean of V is at most b/γ (Tweedie 1983, Meyn and Tweedie 1993, from memory).
 */
export interface LevelDrift {
  /** Above 1. */
  readonly base: number
  readonly constant: number
}

/** Part of the logarithm of the largest base: near 0 the series falls slowly, near 1 its constant grows. */
const parts = [0.5, 0.6, 0.7, 0.8, 0.85, 0.9, 0.95, 0.98, 0.99]

/** The drift function that needs the fewest levels until e^-`wanted`. @throws near-balance (limit) where none is found */
export function levelDrift(structure: LevelStructure, wanted: number): LevelDrift {
  const largest = largestBase(structure)
  let best: LevelDrift | undefined
  let fewest = Number.POSITIVE_INFINITY
  for (const part of parts) {
    const base = Math.exp(part * Math.log(largest))
    const found = driftAt(structure, base)
    if (found === undefined) continue
    const levels = (wanted + Math.log(Math.max(1, found.constant))) / Math.log(base)
    if (levels < fewest) {
      best = found
      fewest = levels
    }
  }
  if (best === undefined) throw nearBalance()
  return best
}

/** The end of the bases at which the drift is inward, from below; at most 1e6. */
function largestBase(structure: LevelStructure): number {
  let low = 0
  let high = Number.NaN
  // By the logarithm: near balance it is tiny.
  for (let step = 1e-8; step < 14; step *= 2) {
    if (inwardVector(structure, Math.exp(step)) === undefined) {
      if (low > 0 || step > 1e-3) {
        high = step
        break
      }
    } else low = step
  }
  if (low === 0) throw nearBalance()
  if (Number.isNaN(high)) return Math.exp(low)
  for (let k = 0; k < 12; k++) {
    const middle = (low + high) / 2
    if (inwardVector(structure, Math.exp(middle)) === undefined) high = middle
    else low = middle
  }
  return Math.exp(low)
}

/** v > 0 with (up · base + local + down / base) v = -w, w near a multiple of v; undefined where there is none. */
function inwardVector({ phases, up, local, down }: LevelStructure, base: number): Float64Array | undefined {
  const m = phases.length
  const minus = new Float64Array(m * m)
  for (let i = 0; i < m; i++) {
    let leaving = 0
    for (let j = 0; j < m; j++) {
      const at = i * m + j
      leaving += up.value[at] + down.value[at] + (i === j ? 0 : local.value[at])
      minus[at] = -(up.value[at] * base + (i === j ? 0 : local.value[at]) + down.value[at] / base)
    }
    minus[i * m + i] += leaving
  }
  // An M-matrix exactly where elimination without exchanges meets positive pivots only (Fiedler and Pták 1962).
  for (let k = 0; k < m; k++) {
    const pivot = minus[k * m + k]
    if (!(pivot > 0)) return undefined
    for (let i = k + 1; i < m; i++) {
      const factor = minus[i * m + k] / pivot
      if (factor === 0) continue
      minus[i * m + k] = factor
      for (let j = k + 1; j < m; j++) minus[i * m + j] -= factor * minus[k * m + j]
    }
  }
  let v = new Float64Array(m).fill(1)
  for (let step = 0; step < 4; step++) {
    const x = v.slice()
    for (let i = 0; i < m; i++) for (let j = 0; j < i; j++) x[i] -= minus[i * m + j] * x[j]
    for (let i = m - 1; i >= 0; i--) {
      for (let j = i + 1; j < m; j++) x[i] -= minus[i * m + j] * x[j]
      x[i] /= minus[i * m + i]
      if (!(x[i] > 0)) return undefined
    }
    const top = x.reduce((most, each) => Math.max(most, each), 0)
    if (!Number.isFinite(top)) return undefined
    v = x.map((each) => each / top)
    if (v.some((each) => !(each > 0))) return undefined
  }
  return v
}

/** Rounding of a drift's terms, each a few products and a sum over the phases. */
const roundingOf = (m: number): number => (6 * m + 20) * 2 ** -53

/** Checks every inequality with its rounding, whatever the vector's own errors. */
export function driftAt(structure: LevelStructure, base: number): LevelDrift | undefined {
  const v = inwardVector(structure, base)
  if (v === undefined) return undefined
  const { phases, boundary, up, local, down } = structure
  const m = phases.length
  const rounding = roundingOf(m)
  let gamma = Number.POSITIVE_INFINITY
  const upper = new Float64Array(m) // drift of level 0 without its way down, rounded up
  for (let i = 0; i < m; i++) {
    let gain = 0
    let size = 0
    let level0 = 0
    for (let j = 0; j < m; j++) {
      const at = i * m + j
      const above = up.value[at] * (base * v[j] - v[i])
      const beside = i === j ? 0 : local.value[at] * (v[j] - v[i])
      const below = down.value[at] * (v[j] / base - v[i])
      gain += above + beside + below
      level0 += above + beside
      size += up.value[at] * (base * v[j] + v[i]) + (i === j ? 0 : local.value[at]) * (v[j] + v[i])
      size += down.value[at] * (v[j] / base + v[i])
    }
    upper[i] = level0 + rounding * size
    gamma = Math.min(gamma, -(gain + rounding * size) / v[i])
  }
  if (!(gamma > 0)) return undefined
  // On the boundary V = 1; level 0 has V = v.
  for (const { from, value } of structure.boundaryDown) upper[from] += value * (1 - v[from]) + rounding * value
  let most = 0
  for (let i = 0; i < m; i++) most = Math.max(most, upper[i] + gamma * v[i])
  const outward = new Float64Array(boundary.length)
  for (const { from, to, value } of structure.boundaryUp) outward[from] += value * (v[to] - 1) + rounding * value
  for (const each of outward) most = Math.max(most, each + gamma)
  const least = v.reduce((smallest, each) => Math.min(smallest, each), 1)
  return { base, constant: (most / gamma / least) * (1 + 2 ** -20) }
}

const nearBalance = () =>
  new StillmarkError(
    {
      code: 'near-balance',
      what: 'The model is so near to balance that no bound on its large counts was found in double precision.',
      next: 'Bring the model further from balance.',
    },
    'limit',
  )
