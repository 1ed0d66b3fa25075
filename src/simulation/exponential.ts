import type { RandomStream } from './random-stream.js'

/**
 * Exponential draws by the ziggurat of Marsaglia and Tsang (2000): 256 layers of equal area under e⁻ˣ. 98.9 % of the
 * draws take two words, one product and one comparison; the law is exact, as with -log(u), at a fraction of its cost.
 * The layer comes from low bits that the 53 bits of the place in the layer leave unused, so the two are independent.
 */
const layers = 256
/** Where the tail begins, and the area of a layer: Marsaglia and Tsang 2000, from memory; the test adds the areas up. */
export const tailStart = 7.69711747013105
const layerArea = 0.003949659822581557

/** Right ends of the layers, length 257; entry 0 is the width of the lowest one with its tail spread out, the last is 0. */
export const layerEnd = new Float64Array(layers + 1)
/** e⁻ˣ at those ends, entry 0 aside. */
export const layerDensity = new Float64Array(layers + 1)
layerEnd[0] = layerArea * Math.exp(tailStart)
layerEnd[1] = tailStart
for (let i = 1; i < layers - 1; i++) {
  layerEnd[i + 1] = -Math.log(layerArea / layerEnd[i] + Math.exp(-layerEnd[i]))
}
for (let i = 0; i <= layers; i++) layerDensity[i] = Math.exp(-layerEnd[i])

/** Exponential with mean 1, positive. */
export function exponential(stream: RandomStream): number {
  for (;;) {
    const high = stream.nextWord()
    const low = stream.nextWord()
    const layer = ((high & 31) << 3) | (low & 7)
    const x = ((high >>> 5) * 2 ** 26 + (low >>> 6) + 1) * 2 ** -53 * layerEnd[layer]
    if (x < layerEnd[layer + 1]) return x
    const settled = outsideTheCore(stream, layer, x)
    if (settled > 0) return settled
  }
}

/** The rare case: the tail, or the corner of a layer that is accepted or not. @returns 0 where a new draw is needed */
export function outsideTheCore(stream: RandomStream, layer: number, x: number): number {
  if (layer === 0) return tailStart - Math.log(stream.nextPositive())
  const height = layerDensity[layer] + stream.nextPositive() * (layerDensity[layer + 1] - layerDensity[layer])
  return height < Math.exp(-x) ? x : 0
}
