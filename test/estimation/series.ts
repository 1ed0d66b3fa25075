import { readFileSync } from 'node:fs'
import seedrandom from 'seedrandom'

/** Seeded draws for the statistical tests: normal by Box and Muller 1958, exponential by inversion. */
export function draws(seed: string) {
  const random = seedrandom(seed)
  const uniform = () => 1 - random() // never 0
  return {
    uniform,
    normal: () => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform()),
    exponential: () => -Math.log(uniform()),
  }
}

/** Batch means of stationary AR(1) series with long-run mean 0: x' = phi·x + N(0, 1). */
export function autoregressive(seed: string, phi: number) {
  const { normal } = draws(seed)
  return (replications: number, batches: number, length: number): Float64Array => {
    const means = new Float64Array(replications * batches)
    for (let r = 0; r < replications; r++) {
      let x = normal() / Math.sqrt(1 - phi * phi)
      for (let b = 0; b < batches; b++) {
        for (let k = 0; k < length; k++) {
          x = phi * x + normal()
          means[r * batches + b] += x / length
        }
      }
    }
    return means
  }
}

/** Waits of successive customers of an M/M/1 line, Lindley's recursion, service rate 1; long-run mean load/(1 - load). */
export function waits(seed: string, load: number, start: 'empty' | 'stationary') {
  const { uniform, exponential } = draws(seed)
  return (replications: number, batches: number, length: number): Float64Array => {
    const means = new Float64Array(replications * batches)
    for (let r = 0; r < replications; r++) {
      let wait = start === 'stationary' && uniform() <= load ? exponential() / (1 - load) : 0
      for (let b = 0; b < batches; b++) {
        for (let k = 0; k < length; k++) {
          means[r * batches + b] += wait / length
          wait = Math.max(0, wait + exponential() - exponential() / load)
        }
      }
    }
    return means
  }
}

/** A data set of the NIST Statistical Reference Datasets. */
export function referenceData(name: string): Float64Array {
  const text = readFileSync(new URL(`../published/references/nist-strd/${name}.dat`, import.meta.url), 'utf8')
  const lines = text.split(/\r?\n/)
  const from = lines.findIndex((line) => /^-{5,}/.test(line.trim()))
  return Float64Array.from(lines.slice(from + 1).flatMap((line) => (line.trim() === '' ? [] : [Number(line)])))
}

export function referenceCases(file: string): {
  readonly id: string
  readonly model: Readonly<Record<string, string | number>>
  readonly values: Readonly<Record<string, string | number>>
}[] {
  return JSON.parse(readFileSync(new URL(`../published/references/${file}.json`, import.meta.url), 'utf8')).cases
}

export const relative = (value: number, expected: number): number =>
  value === expected ? 0 : Math.abs(value - expected) / Math.abs(expected)
