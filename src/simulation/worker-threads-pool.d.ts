declare module 'worker-threads-pool' {
  import type { Worker, WorkerOptions } from 'node:worker_threads'

  export default class Pool {
    constructor(options: { max: number })
    acquire(file: string | URL, options: WorkerOptions, done: (error: Error | null, worker: Worker) => void): void
    destroy(done?: () => void): void
  }
}
