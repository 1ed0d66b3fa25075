import { SingleBar } from 'cli-progress'
import type { Progress } from '../jobs/options.js'
import { countInWords } from '../report/digits.js'

/** A line on standard error that tells how far a job is, and is gone when it is done. */
export interface ProgressLine {
  show(progress: Progress): void
  clear(): void
}

export const noProgress: ProgressLine = { show: () => {}, clear: () => {} }

/** A job that is done sooner shows none: a line that flickers tells nothing. Milliseconds. */
const patience = 300
const barWidth = 24
/** Rates are told once there is something to tell them from. Seconds. */
const rateAfter = 0.5

export function progressOn(stream: NodeJS.WriteStream, now: () => number = () => performance.now()): ProgressLine {
  const begun = now()
  let stage: Progress['stage'] | undefined
  let stageBegun = begun
  let latest: Progress | undefined
  let bar: SingleBar | undefined
  const text = (): string => (latest === undefined ? '' : progressText(latest, (now() - stageBegun) / 1000))
  return {
    show(progress) {
      if (progress.stage !== stage) {
        stage = progress.stage
        stageBegun = now()
      }
      latest = progress
      if (bar === undefined && now() - begun >= patience) {
        bar = new SingleBar({
          stream,
          format: text,
          clearOnComplete: true,
          gracefulExit: false,
          hideCursor: false,
          fps: 10,
        })
        bar.start(1, 0)
      }
      bar?.update(0)
    },
    clear() {
      bar?.stop()
      bar = undefined
      stage = undefined
    },
  }
}

const stages: Readonly<Record<Progress['stage'], string>> = {
  reading: 'reading',
  exploring: 'listing states',
  structure: 'finding classes',
  solving: 'solving',
  pilot: 'finding the warm-up',
  simulating: 'simulating',
  comparing: 'comparing',
}

/**
 * `simulating  ████████░░░░░░░░  43 %  2.3 million of 5.4 million events  12 million/s  2 s left`
 *
 * @param seconds since the stage began
 */
export function progressText({ stage, done, of, unit }: Progress, seconds: number): string {
  const parts = [stages[stage]]
  const part = done === undefined || of === undefined || !(of > 0) ? undefined : Math.max(0, Math.min(1, done / of))
  if (part !== undefined) parts.push(`${barOf(part)}  ${String(Math.floor(100 * part)).padStart(2)} %`)
  if (done !== undefined && unit !== undefined) {
    parts.push(
      of === undefined ? `${countInWords(done)} ${unit}` : `${countInWords(done)} of ${countInWords(of)} ${unit}`,
    )
    if (seconds >= rateAfter && done > 0) parts.push(`${countInWords(done / seconds)}/s`)
  }
  if (part !== undefined && part > 0 && seconds >= rateAfter)
    parts.push(`${timeInWords((seconds * (1 - part)) / part)} left`)
  return parts.join('  ')
}

const barOf = (part: number): string => {
  const filled = Math.round(part * barWidth)
  return '█'.repeat(filled) + '░'.repeat(barWidth - filled)
}

/** `8 s`, `3 min`, `2 h 10 min`. */
export function timeInWords(seconds: number): string {
  if (seconds < 99.5) return `${Math.ceil(seconds)} s`
  const minutes = Math.round(seconds / 60)
  return minutes < 100 ? `${minutes} min` : `${Math.floor(minutes / 60)} h ${minutes % 60} min`
}
