import { StillmarkError } from '../errors/stillmark-error.js'
import type { JobOptions, Progress } from './options.js'

/**
 * The time limit of a job. Long stages that run in one piece call `onProgress` now and then: there the clock is looked
 * at, so that the limit also holds where no timer can fire.
 */
export function withDeadline(options: JobOptions): {
  readonly onProgress: (progress: Progress) => void
  readonly signal: AbortSignal
} {
  const { timeLimitSeconds } = options
  const end = timeLimitSeconds === undefined ? Number.POSITIVE_INFINITY : performance.now() + timeLimitSeconds * 1000
  const controller = new AbortController()
  const stop = (reason: unknown) => controller.abort(reason)
  if (options.signal?.aborted) stop(options.signal.reason)
  options.signal?.addEventListener('abort', () => stop(options.signal?.reason), { once: true })
  if (timeLimitSeconds !== undefined) {
    setTimeout(() => stop(timeIsUp(timeLimitSeconds, undefined)), timeLimitSeconds * 1000).unref()
  }
  const onProgress = (progress: Progress) => {
    if (performance.now() > end) throw timeIsUp(timeLimitSeconds ?? 0, progress)
    options.onProgress?.(progress)
  }
  return { onProgress, signal: controller.signal }
}

function timeIsUp(seconds: number, reached: Progress | undefined): StillmarkError {
  const { stage, done, unit } = reached ?? {}
  const far = done === undefined || unit === undefined ? '' : ` (${done.toLocaleString('en-US')} ${unit} done)`
  const at = stage === undefined ? '' : ` while ${stage}${far}`
  return new StillmarkError(
    {
      code: 'time-limit',
      what: `The time limit of ${seconds} s is over${at}.`,
      next: 'Allow more with --time-limit, or make the run shorter with --run-length or the model smaller.',
    },
    'limit',
  )
}
