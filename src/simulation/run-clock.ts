import type { RunSettings } from './observations.js'

/** Stretches of a replication: the warm-up, where there is one, is stretch -1, the batches are 0 … batches - 1. */
export const firstStretch = ({ warmUp }: RunSettings): number => (warmUp > 0 ? -1 : 0)

/** Length of a stretch in time units, for the clock of continuous time. */
export const lengthOf = ({ warmUp, runLength, batches }: RunSettings, stretch: number): number =>
  stretch < 0 ? warmUp : runLength / batches

/**
 * Where a stretch ends in steps from the start, for the clock of discrete time: at `part` (below 1) of step `whole`.
 * The last one ends at the whole step warm-up + run length, without rounding.
 */
export function borderOf({ warmUp, runLength, batches }: RunSettings, stretch: number) {
  if (stretch < 0) return { whole: warmUp, part: 0 }
  const steps = runLength * (stretch + 1)
  const part = (steps % batches) / batches
  return { whole: warmUp + Math.floor(steps / batches), part }
}

/** Where a stretch begins, in time units from the start. */
export const beginOf = ({ warmUp, runLength, batches }: RunSettings, stretch: number): number =>
  stretch < 0 ? 0 : warmUp + (stretch * runLength) / batches
