import { StillmarkError } from '../errors/stillmark-error.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import { solve } from '../stationary/solve.js'
import { solveUnbounded } from '../stationary/solve-unbounded.js'
import type { withDeadline } from './deadline.js'
import type { Ground } from './ground.js'
import type { JobOptions } from './options.js'
import { explain } from './sentences.js'

/** The exact long-run answer, or why there is none. */
export interface ExactOrAbsent {
  readonly exact?: ExactAnswer
  readonly absent: string
}

/**
 * @throws StillmarkError where a finite model is beyond the limits; an unbounded one that can't be solved is told in
 *   `absent`, since its class is an answer by itself
 */
export function exactAnswer(
  { model, finite, countable, part }: Ground,
  options: JobOptions,
  { onProgress, signal }: ReturnType<typeof withDeadline>,
): ExactOrAbsent {
  const solving = {
    maxMemoryBytes: options.maxMemoryBytes,
    signal,
    onProgress: (done: number) => onProgress({ stage: 'solving', done: Math.round(1000 * done), of: 1000 }),
  }
  onProgress({ stage: 'solving' })
  if (finite !== undefined) {
    return { exact: solve(model, finite.chain, finite.joined, finite.structure, solving), absent: '' }
  }
  if (model.kind !== 'variables' || countable === undefined || part.recurrence !== 'positive recurrent') {
    return { absent: explain(part) }
  }
  try {
    const exact = solveUnbounded(model, countable, solving)
    if (exact !== undefined) return { exact, absent: '' }
    return { absent: `The model has a steady state (${part.grade}), but no exact method here covers its form.` }
  } catch (error) {
    if (error instanceof StillmarkError && error.kind === 'limit' && error.code !== 'time-limit') {
      return { absent: `The model has a steady state (${part.grade}), but it was not solved: ${error.what}` }
    }
    throw error
  }
}
