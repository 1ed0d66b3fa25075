import { SingleBar } from 'cli-progress'
import type { Progress } from '../jobs/options.js'
import { countInWords } from '../report/digits.js'

export interface ProgressDisplay {
  readonly show: (progress: Progress) => void
  /** Takes it off the screen. */
  readonly end: () => void
}

const words: Readonly<Record<Progress['stage'], string>> = {
  reading: 'reading',
  exploring: 'listing states',
  structure: 'finding classes',
  solving: 'solving exactly',
  pilot: 'pilot runs',
  simulating: 'simulating',
  comparing: 'comparing',
}

/** A bar on standard error with rate and time left, on a terminal only; it is gone when the work is done. */
export function progressDisplay(wanted: boolean): ProgressDisplay {
  if (!wanted || process.stderr.isTTY !== true) return { show: () => undefined, end: () => undefined }
  const bar = new SingleBar({
    stream: process.stderr,
    format: '{stage} {bar} {percentage} % {rate} {left}',
    barsize: 24,
    clearOnComplete: true,
    hideCursor: true,
    fps: 8,
    stopOnComplete: false,
    linewrap: false,
  })
  let stage: Progress['stage'] | undefined
  let begun = 0
  return {
    show(progress) {
      if (progress.stage !== stage) {
        if (stage !== undefined) bar.stop()
        stage = progress.stage
        begun = performance.now()
        bar.start(progress.of ?? 1, 0, { stage: words[stage], rate: '', left: '' })
      }
      const { done, of, unit } = progress
      if (done === undefined) return
      const seconds = (performance.now() - begun) / 1000
      const rate = seconds > 0.2 && unit !== undefined ? `${countInWords(done / seconds)} ${unit}/s` : ''
      const left =
        of !== undefined && done > 0 && seconds > 0.2 ? `${Math.ceil((seconds * (of - done)) / done)} s left` : ''
      if (of !== undefined) bar.setTotal(of)
      bar.update(of === undefined ? 0 : Math.min(done, of), { stage: words[progress.stage], rate, left })
    },
    end() {
      if (stage !== undefined) bar.stop()
      stage = undefined
    },
  }
}
