import type { Worker } from 'node:worker_threads'
import Pool from 'worker-threads-pool'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { Model } from '../model/model.js'
import type { DistributionsAs } from './columns.js'
import type { ValueTimes } from './expanded-kernel.js'
import type { EnumeratedTask, Task } from './task.js'

/** What a worker is handed; arrays in it lie in shared memory, the scenario is copied and compiled there. */
export interface WorkerJob {
  readonly task: Task | EnumeratedTask
  /** Only where the chain is not enumerated. */
  readonly scenario?: Model['scenario']
  readonly distributionsAs: DistributionsAs
  /** The next replication that nobody has taken, then the lowest that failed (all below it still count). */
  readonly control: Int32Array
}

/** What a worker says: a replication's times at each value, or what went wrong in it. */
export type WorkerMessage =
  | { readonly kind: 'done'; readonly replication: number; readonly valueTimes: readonly (readonly ValueTimes[])[] }
  | { readonly kind: 'failed'; readonly replication: number; readonly error: CarriedError }

/** An error as plain data: a class does not survive the way between threads. */
export type CarriedError =
  | { readonly faults: StillmarkError['faults']; readonly kind: StillmarkError['kind'] }
  | { readonly stack: string }

/** In the built program the worker lies beside this file; under a runner of TypeScript it is the built one. */
const workerFile = new URL(
  import.meta.url.endsWith('.ts') ? '../../dist/simulation/worker.js' : './worker.js',
  import.meta.url,
)

/**
 * Runs the replications on long-lived workers that take them off a shared counter; what a replication does depends on
 * its number alone. Returns when every worker has ended, also after a failure.
 *
 * @returns times at each value by replication, for models that are not enumerated
 * @throws what `watch` throws, called now and then and when the signal fires; else the error of the lowest replication
 *   that failed
 */
export async function replicateByWorkers(
  { task, scenario, distributionsAs }: Omit<WorkerJob, 'control'>,
  workers: number,
  { watch, signal, everyMilliseconds }: { watch: () => void; signal?: AbortSignal; everyMilliseconds: number },
): Promise<readonly (readonly (readonly ValueTimes[])[])[]> {
  const { replications } = task.settings
  const control = new Int32Array(new SharedArrayBuffer(8))
  control[1] = replications
  const job: WorkerJob = { task, scenario: 'rowStart' in task ? undefined : scenario, distributionsAs, control }
  const valueTimes: (readonly (readonly ValueTimes[])[])[] = new Array(replications).fill([])
  let failure: { readonly replication: number; readonly error: unknown } | undefined
  const fail = (replication: number, error: unknown) => {
    if (failure === undefined || replication < failure.replication) failure = { replication, error }
  }
  const stopAll = (error: unknown) => {
    fail(-1, error)
    Atomics.store(control, 1, -1)
  }
  const look = () => {
    try {
      watch()
    } catch (error) {
      stopAll(error)
    }
  }
  const pool = new Pool({ max: workers })
  const ended = Array.from(
    { length: workers },
    () =>
      new Promise<void>((resolve) => {
        pool.acquire(workerFile, { workerData: job }, (refused, worker: Worker) => {
          if (refused !== null) {
            stopAll(refused)
            resolve()
            return
          }
          worker.on('message', (message: WorkerMessage) => {
            if (message.kind === 'done') valueTimes[message.replication] = message.valueTimes
            else fail(message.replication, revived(message.error))
          })
          worker.on('error', stopAll)
          worker.on('exit', () => resolve())
        })
      }),
  )
  const timer = setInterval(look, everyMilliseconds)
  signal?.addEventListener('abort', look, { once: true })
  try {
    await Promise.all(ended)
  } finally {
    clearInterval(timer)
    signal?.removeEventListener('abort', look)
    pool.destroy()
  }
  if (failure !== undefined) throw failure.error
  return valueTimes
}

export const carried = (error: unknown): CarriedError =>
  error instanceof StillmarkError
    ? { faults: error.faults, kind: error.kind }
    : { stack: error instanceof Error ? (error.stack ?? error.message) : String(error) }

function revived(error: CarriedError): Error {
  return 'faults' in error ? new StillmarkError(error.faults, error.kind) : new Error(error.stack)
}
