/** An estimate with its interval: estimate ± halfWidth holds the long-run value at the stated confidence. */
export interface Estimate {
  readonly estimate: number
  /** In the unit of the measure; undefined where no honest interval can be given, `noInterval` says why. */
  readonly halfWidth?: number
  readonly noInterval?: string
  readonly confidence: number
  /** In words: "batch means, 16 replications × 8 batches". */
  readonly method: string
  /** Standard error of the estimate and its degrees of freedom: what a test of a hypothesis needs. */
  readonly standardError?: number
  readonly degreesOfFreedom?: number
  /** Observations or batches that the estimate rests on, and the von Neumann test of their independence. */
  readonly batches?: number
  readonly batchTest?: { readonly ratio: number; readonly pValue: number }
}
