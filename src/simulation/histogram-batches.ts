import { StillmarkError } from '../errors/stillmark-error.js'

/** Shares that are kept of one measure at most, 64 MiB of them, before batches are joined. */
const sharesKept = 2 ** 23
/** Shares of one measure, with a single batch a replication, beyond which it is refused. */
const sharesPossible = 2 ** 26

/**
 * Batches a replication for which a measure's shares of time are kept: all where they fit, else the largest divisor
 * that does, 1 at least.
 * @throws StillmarkError too-many-values
 */
export function histogramBatches(measure: string, replications: number, batches: number, values: number): number {
  if (replications * values > sharesPossible) throw tooManyValues(measure, values)
  for (let kept = batches; kept > 1; kept--) {
    if (batches % kept === 0 && replications * kept * values <= sharesKept) return kept
  }
  return 1
}

export const tooManyValues = (measure: string, values: number): StillmarkError =>
  new StillmarkError(
    {
      code: 'too-many-values',
      where: { key: `measures.${measure}` },
      what: `The measure "${measure}" takes more than ${(values - 1).toLocaleString('en-US')} different values, too many to keep the share of time at each.`,
      next: 'Make it coarser, as in floor(x / 10) * 10, or run fewer replications.',
    },
    'limit',
  )
