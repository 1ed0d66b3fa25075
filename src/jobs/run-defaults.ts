/** What a run takes where neither the file nor an option says it. README names each; change both together. */
export const runDefaults = {
  seed: 'stillmark',
  replications: 16,
  confidence: 0.95,
  /** The difference that matters: 2 % of the exact value. */
  tolerance: { kind: 'relative', value: 0.02 },
  /** Batches of equal length within each replication; joined where they are correlated. */
  batches: 32,
  /** Firings in all that a run of automatic length may take: a few seconds. */
  events: 4e7,
  /** States that are enumerated at most. */
  maxStates: 5_000_000,
  /**
   * States that are enumerated of a model with a variable without bound, to see whether guards bound it after all,
   * before it is treated as unbounded.
   */
  statesBeforeUnbounded: 50_000,
  /** The same where no theorem decides the class of the unbounded model. */
  statesWhereOpen: 500_000,
} as const
