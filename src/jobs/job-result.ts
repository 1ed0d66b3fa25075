import type { StillmarkDocument } from './document.js'

export interface JobResult {
  readonly document: StillmarkDocument
  /** As in the table of exit statuses: 0 agreement or decided, 1 disagreement or no steady state, 3 undecided. */
  readonly exitStatus: 0 | 1 | 3
  readonly details: JobDetails
}

/** What the terminal and the reports show beyond the contract. */
export interface JobDetails {
  readonly unit: string
  readonly time: 'continuous' | 'discrete'
  /** The scenario file's text. */
  readonly scenarioText: string
  /** Constants overridden from outside, as written there. */
  readonly overrides: ReadonlyMap<string, string>
  /** Of the verdicts. */
  readonly confidence?: number
  /** The difference that matters, by measure: as the file or the option gives it. */
  readonly tolerances?: Readonly<Record<string, { readonly kind: 'absolute' | 'relative'; readonly value: number }>>
  /** Claims as written, by measure. */
  readonly claims?: Readonly<Record<string, { readonly written: string; readonly source?: string }>>
  /** Why the warm-up is as long as it is, one sentence. */
  readonly warmUpBasis?: string
  /** Why the run is as long as it is, one sentence. */
  readonly runLengthBasis?: string
  /** What the model's author expects. */
  readonly expect?: string
  /** Whether that came out. */
  readonly expectationMet?: boolean
  /** The next action in one sentence: "nothing" where there is none. */
  readonly next: string
}
