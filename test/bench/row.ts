/** One line of the table of benchmarks. */
export interface BenchRow {
  readonly what: string
  readonly size: string
  /** With its unit: "21.3 million jumps/s", "1.8 s". */
  readonly ours: string
  /** What it is held against, with its figure; or that it is absent on this machine. */
  readonly yardstick: string
  /** Ours over the yardstick, larger is better; undefined where the yardstick is absent. */
  readonly ratio?: number
  readonly spread?: string
}
