#!/usr/bin/env node
import type { Surroundings } from './run.js'

// The signals come first, before anything else is loaded: whenever it comes, Ctrl-C ends with 130.
let interrupted = (): void => process.exit(130)
for (const signal of ['SIGINT', 'SIGTERM'] as const) {
  process.on(signal, () => {
    process.exitCode = 130
    interrupted()
  })
}

const { stdout, stderr, env: environment } = process

// A reader that has seen enough (`| head`) closes the pipe: what was decided so far is the ending.
for (const stream of [stdout, stderr]) {
  stream.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code === 'EPIPE') process.exit()
    throw error
  })
}

const { readCommandLine } = await import('./program.js')
const request = readCommandLine(
  process.argv.slice(2),
  (text) => void stdout.write(text),
  (text) => void stderr.write(text),
  stdout.columns,
)
if ('exitStatus' in request) process.exitCode = request.exitStatus
else {
  const { defect, run } = await import('./run.js')
  const surroundings: Surroundings = {
    stdout,
    stderr,
    environment,
    onInterrupt: (callback) => {
      interrupted = callback
    },
  }
  try {
    process.exitCode = await run(request, surroundings)
  } catch (error) {
    const { message, stack } = error instanceof Error ? error : new Error(String(error))
    process.exitCode = defect({ message, stack: stack ?? '' }, (text) => void stderr.write(text), environment)
  }
}
