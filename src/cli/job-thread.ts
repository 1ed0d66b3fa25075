import { getHeapStatistics } from 'node:v8'
import { Worker } from 'node:worker_threads'
import type { Progress } from '../jobs/options.js'
import type { Message, Order } from './job-worker.js'

export type Outcome = Exclude<Message, { kind: 'progress' }> | { readonly kind: 'interrupted' }

/** Runs jobs one after another in a thread of their own. */
export interface JobThread {
  run(order: Order, onProgress: (progress: Progress) => void): Promise<Outcome>
  /** Ends the thread at once; a job that runs ends as interrupted. */
  stop(): Promise<void>
}

export function startJobThread(): JobThread {
  // As much heap as the main thread would have had: NODE_OPTIONS=--max-old-space-size reaches the job.
  const worker = new Worker(new URL('./job-worker.js', import.meta.url), {
    resourceLimits: { maxOldGenerationSizeMb: Math.floor(getHeapStatistics().heap_size_limit / 2 ** 20) },
  })
  let stopped = false
  let running:
    | { readonly end: (outcome: Outcome) => void; readonly onProgress: (progress: Progress) => void }
    | undefined
  const end = (outcome: Outcome): void => {
    running?.end(outcome)
    running = undefined
  }
  // Set once for all jobs: a worker whose listeners are taken away and set anew receives no more messages (Node 20).
  worker.on('message', (message: Message) => {
    if (message.kind === 'progress') running?.onProgress(message.progress)
    else end(message)
  })
  worker.on('error', (error) => end(ofThread(error)))
  worker.on('exit', () =>
    end(stopped ? { kind: 'interrupted' } : { kind: 'defect', message: 'the job ended without a result', stack: '' }),
  )
  return {
    run: (order, onProgress) =>
      new Promise((resolve) => {
        if (stopped) return resolve({ kind: 'interrupted' })
        running = { end: resolve, onProgress }
        worker.postMessage(order)
      }),
    async stop() {
      stopped = true
      await worker.terminate()
    },
  }
}

/** What the thread could not catch itself: above all, no memory left. */
function ofThread(error: unknown): Outcome {
  const { code, message, stack } = error as NodeJS.ErrnoException
  if (code !== 'ERR_WORKER_OUT_OF_MEMORY') return { kind: 'defect', message, stack: stack ?? '' }
  return {
    kind: 'faults',
    faultKind: 'limit',
    faults: [
      {
        code: 'out-of-memory',
        what: 'The memory that Node allows is used up.',
        next: 'Make the model smaller, or allow more: NODE_OPTIONS=--max-old-space-size=8192 (in MB).',
      },
    ],
  }
}
