import { toNumber } from '../numbers/fraction.js'
import type { Scenario } from '../scenario/scenario.js'
import type { JobOptions } from './options.js'
import { runDefaults } from './run-defaults.js'

/** What is asked of a run: options first, then the file, then the defaults. Undefined: to be chosen. */
export interface RunRequest {
  readonly seed: string
  readonly replications: number
  readonly confidence: number
  readonly tolerance: { readonly kind: 'absolute' | 'relative'; readonly value: number }
  readonly runLength?: number
  /** A length in time units, or undefined: by the automatic rule. */
  readonly warmUp?: number
  /** Name of the rule that is asked for: auto, mser. */
  readonly warmUpRule?: string
  /** Threads; they bear on no digit. */
  readonly workers?: number
}

export function runRequest(scenario: Scenario, options: JobOptions): RunRequest {
  const { simulation } = scenario
  const inFile = simulation.tolerance
  const warmUp = options.warmUp ?? simulation.warmUp
  return {
    seed: options.seed ?? simulation.seed ?? runDefaults.seed,
    replications: options.replications ?? simulation.replications ?? runDefaults.replications,
    confidence: options.confidence ?? simulation.confidence ?? runDefaults.confidence,
    tolerance:
      options.tolerance ??
      (inFile === undefined ? runDefaults.tolerance : { kind: inFile.kind, value: toNumber(inFile.value) }),
    runLength: options.runLength ?? simulation.runLength,
    warmUp: typeof warmUp === 'number' ? warmUp : undefined,
    ...(typeof warmUp === 'string' ? { warmUpRule: warmUp } : {}),
    workers: options.workers,
  }
}
