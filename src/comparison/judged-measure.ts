import type { MeasureComparison } from './verdict.js'

/** The difference that matters: a plain number, or a part of the exact value. */
export interface Tolerance {
  readonly kind: 'absolute' | 'relative'
  readonly value: number
}

export interface Tolerance {
  readonly kind: 'absolute' | 'relative'
  readonly value: number
}

/** Why a comparison came out as it did; findings are made from it. */
export type Reason =
  | 'inside'
  | 'harmless'
  | 'off'
  | 'too wide'
  | 'no interval'
  | 'bias left'
  | 'interval too narrow'
  | 'slow'
  | 'no percentage'
  | 'same'

export interface JudgedMeasure extends MeasureComparison {
  readonly reason: Reason
  readonly exact: number
  readonly estimate: number
  /** At the confidence that is adjusted for the number of measures; undefined where there is none. */
  readonly adjustedHalfWidth?: number
}

/** Values that differ by less, relative to their size, are the same number, rounded differently. */
export const rounding = 1e-12
