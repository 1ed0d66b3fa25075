import { parentPort } from 'node:worker_threads'
import { type Fault, type FaultKind, StillmarkError } from '../errors/stillmark-error.js'
import { check } from '../jobs/check.js'
import { classify } from '../jobs/classify.js'
import type { CommandName } from '../jobs/document.js'
import type { JobResult } from '../jobs/job-result.js'
import type { JobOptions, Progress } from '../jobs/options.js'
import { simulate } from '../jobs/simulate.js'
import { solve } from '../jobs/solve.js'

// The thread in which the jobs run. An exact solution computes for a long time in one piece; were it on the main
// thread, Ctrl-C and the progress bar would wait for it, and a heap that overflows would take the whole program down.

export interface Order {
  readonly command: CommandName
  readonly file: string
  readonly options: Omit<JobOptions, 'signal' | 'onProgress'>
}

export type Message =
  | { readonly kind: 'progress'; readonly progress: Progress }
  | { readonly kind: 'result'; readonly result: JobResult }
  | { readonly kind: 'faults'; readonly faultKind: FaultKind; readonly faults: readonly Fault[] }
  | { readonly kind: 'defect'; readonly message: string; readonly stack: string }

const jobs = { check, classify, solve, simulate }
/** Milliseconds between two messages of the same stage: a bar needs no more. */
const interval = 100

const port = parentPort
if (port === null) throw new Error('job-worker runs as a worker thread only')
const tell = (message: Message): void => port.postMessage(message)

port.on('message', async ({ command, file, options }: Order) => {
  let last = 0
  let stage = ''
  const onProgress = (progress: Progress): void => {
    const now = performance.now()
    if (progress.stage === stage && now - last < interval) return
    last = now
    stage = progress.stage
    tell({ kind: 'progress', progress })
  }
  try {
    tell({ kind: 'result', result: await jobs[command](file, { ...options, onProgress }) })
  } catch (error) {
    if (error instanceof StillmarkError) tell({ kind: 'faults', faultKind: error.kind, faults: error.faults })
    else {
      const { message, stack } = error instanceof Error ? error : new Error(String(error))
      tell({ kind: 'defect', message, stack: stack ?? '' })
    }
  }
})
