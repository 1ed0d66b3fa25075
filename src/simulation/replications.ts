import { availableParallelism } from 'node:os'
import type { Chain } from '../chain/chain.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { Model } from '../model/model.js'
import { type Columns, columnsOf, type DistributionsAs } from './columns.js'
import { replicateEnumerated } from './enumerated-kernel.js'
import { enumeratedTask } from './enumerated-task.js'
import { replicateExpanded, type ValueTimes } from './expanded-kernel.js'
import { ownMemory, sharedMemory } from './memory.js'
import type { RunSettings } from './observations.js'
import type { Purpose } from './random-stream.js'
import type { EnumeratedTask, Task } from './task.js'
import { replicateByWorkers } from './worker-pool.js'

export interface RunOptions {
  /** Threads; by default one a core. With one, all is done in the calling thread. No digit depends on it. */
  readonly workers?: number
  /** Firings after which a replication stops; by default 10⁸ where the chain is not enumerated, else no limit. */
  readonly maxEvents?: number
  /** Called about ten times a second. What it throws ends the run. */
  readonly onProgress?: (done: { readonly events: number; readonly fraction: number }) => void
  readonly signal?: AbortSignal
}

/** What the replications leave behind, before it is put in the form of observations. */
export interface Replicated {
  readonly columns: Columns
  readonly task: Task | EnumeratedTask
  /** For models that are not enumerated: by replication, histogram and batch. */
  readonly valueTimes: readonly (readonly (readonly ValueTimes[])[])[]
  readonly workers: number
  /** Wall time in seconds. */
  readonly seconds: number
}

/** A model that explodes or drifts off makes ever more events: it must stop by itself. */
const eventsWhereUnbounded = 1e8
const progressMilliseconds = 100

/**
 * Runs all replications.
 * @throws StillmarkError interrupted (or the signal's own reason, where that is a StillmarkError); what the model
 *   throws, from the lowest replication that failed, whatever the number of workers
 */
export async function replicate(
  model: Model,
  chain: Chain | undefined,
  settings: RunSettings,
  use: { readonly purpose: Purpose; readonly distributionsAs: DistributionsAs },
  options: RunOptions,
): Promise<Replicated> {
  checkSettings(model, settings)
  const begin = performance.now()
  const { replications, batches } = settings
  const workers = Math.max(1, Math.min(options.workers ?? availableParallelism(), replications))
  const memory = workers > 1 ? sharedMemory : ownMemory
  const columns = columnsOf(model, use.distributionsAs)
  const width = columns.averages.length + columns.firings.length
  const common: Task = {
    settings,
    purpose: use.purpose,
    time: model.time,
    maxEvents: options.maxEvents ?? (chain === undefined ? eventsWhereUnbounded : Number.POSITIVE_INFINITY),
    output: {
      means: memory.doubles(replications * batches * width).fill(Number.NaN),
      events: memory.doubles(replications),
      stoppedAt: memory.doubles(replications).fill(Number.NaN),
      completed: memory.integers(replications),
      fraction: memory.doubles(replications),
      endState: memory.integers(replications),
      endValues: memory.doubles(chain === undefined && model.kind === 'variables' ? replications * model.width : 0),
    },
  }
  const task = chain === undefined ? common : enumeratedTask(common, model, chain, columns, memory)
  const watch = () => {
    if (options.signal?.aborted) throw reasonOf(options.signal)
    options.onProgress?.(reached(task))
  }
  watch()
  const valueTimes =
    workers > 1
      ? await replicateByWorkers({ task, scenario: model.scenario, distributionsAs: use.distributionsAs }, workers, {
          watch,
          signal: options.signal,
          everyMilliseconds: progressMilliseconds,
        })
      : await replicateHere(model, columns, task, watch, options.signal)
  options.onProgress?.(reached(task))
  return { columns, task, valueTimes, workers, seconds: (performance.now() - begin) / 1000 }
}

/** The generator of one replication; the same in the calling thread and in a worker. */
export function replication(
  model: Model | undefined,
  columns: Columns | undefined,
  task: Task | EnumeratedTask,
  number: number,
): Generator<void, readonly (readonly ValueTimes[])[]> {
  if ('rowStart' in task) return withoutValueTimes(replicateEnumerated(task, number))
  if (model?.kind !== 'variables' || columns === undefined) {
    throw new TypeError('a table is simulated through its chain')
  }
  return replicateExpanded(model, columns, task, number)
}

function* withoutValueTimes(walk: Generator<void, void>): Generator<void, readonly (readonly ValueTimes[])[]> {
  yield* walk
  return []
}

async function replicateHere(
  model: Model,
  columns: Columns,
  task: Task | EnumeratedTask,
  watch: () => void,
  signal: AbortSignal | undefined,
) {
  const valueTimes: (readonly (readonly ValueTimes[])[])[] = []
  let last = performance.now()
  for (let number = 0; number < task.settings.replications; number++) {
    const walk = replication(model, columns, task, number)
    for (;;) {
      const { done, value } = walk.next()
      if (done) {
        valueTimes.push(value)
        break
      }
      const now = performance.now()
      if (now - last < progressMilliseconds / 2) continue
      last = now
      // Lets timers and signals in, which a busy thread would keep waiting.
      await new Promise((resume) => setImmediate(resume))
      if (signal?.aborted) throw reasonOf(signal)
      watch()
    }
  }
  return valueTimes
}

function reached({ output }: Task) {
  let events = 0
  let fraction = 0
  for (let r = 0; r < output.events.length; r++) {
    events += output.events[r]
    fraction += output.fraction[r]
  }
  return { events, fraction: fraction / output.events.length }
}

/** Why a run was ended from outside. */
export function reasonOf(signal: AbortSignal): StillmarkError {
  if (signal.reason instanceof StillmarkError) return signal.reason
  return new StillmarkError({ code: 'interrupted', what: 'The simulation was interrupted.' }, 'interrupted')
}

/** @throws StillmarkError bad-run-settings */
function checkSettings(model: Model, { replications, warmUp, runLength, batches }: RunSettings) {
  const wrong = (what: string, next: string) => new StillmarkError({ code: 'bad-run-settings', what, next })
  if (!Number.isSafeInteger(replications) || replications < 1) {
    throw wrong(`${replications} replications can't be run.`, 'Give a whole number, 1 or more.')
  }
  if (!Number.isSafeInteger(batches) || batches < 1) {
    throw wrong(`${batches} batches can't be made.`, 'Give a whole number, 1 or more.')
  }
  if (!Number.isFinite(runLength) || !(runLength > 0)) {
    throw wrong(`A run of length ${runLength} observes nothing.`, 'Give a run length above 0.')
  }
  if (!Number.isFinite(warmUp) || !(warmUp >= 0)) {
    throw wrong(`A warm-up of length ${warmUp} is not possible.`, 'Give a length of 0 or more.')
  }
  if (model.time === 'discrete' && !(Number.isSafeInteger(runLength) && Number.isSafeInteger(warmUp))) {
    throw wrong(
      `In discrete time a warm-up of ${warmUp} and a run length of ${runLength} are not whole numbers of steps.`,
      'Give whole numbers.',
    )
  }
}
