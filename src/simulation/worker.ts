/** A worker of the simulation: takes replications off the shared counter until there are none left, then ends. */
import { parentPort, workerData } from 'node:worker_threads'
import { columnsOf } from './columns.js'
import { replication } from './replications.js'
import { carried, type WorkerJob, type WorkerMessage } from './worker-pool.js'

const { task, scenario, distributionsAs, control } = workerData as WorkerJob
const say = (message: WorkerMessage) => parentPort?.postMessage(message)

let model: ReturnType<typeof import('../model/compile.js').compile> | undefined
let columns: ReturnType<typeof columnsOf> | undefined

for (;;) {
  const number = Atomics.add(control, 0, 1)
  if (number >= Atomics.load(control, 1)) break
  try {
    if (scenario !== undefined && model === undefined) {
      // Loaded only where it is needed: a worker on an enumerated chain starts the sooner.
      model = (await import('../model/compile.js')).compile(scenario)
      columns = columnsOf(model, distributionsAs)
    }
    const walk = replication(model, columns, task, number)
    let step = walk.next()
    // One that stands above a replication that failed bears on nothing any more; -1 ends all.
    while (!step.done && number < Atomics.load(control, 1)) step = walk.next()
    if (step.done && scenario !== undefined) say({ kind: 'done', replication: number, valueTimes: step.value })
  } catch (error) {
    lowerTo(number)
    say({ kind: 'failed', replication: number, error: carried(error) })
    break
  }
}

function lowerTo(number: number) {
  for (;;) {
    const lowest = Atomics.load(control, 1)
    if (lowest <= number || Atomics.compareExchange(control, 1, lowest, number) === lowest) return
  }
}
