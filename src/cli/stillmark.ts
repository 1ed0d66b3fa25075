#!/usr/bin/env node
import type { ExitStatus } from './exit-status.js'
import { readCommandLine } from './program.js'
import { defect, run } from './run.js'

const { stdout, stderr, env } = process

// A reader that has seen enough (`| head`) closes the pipe: what was decided so far is the ending.
for (const stream of [stdout, stderr]) {
  stream.on('error', (error: NodeJS.ErrnoException) => {
    if (error.code === 'EPIPE') process.exit()
    throw error
  })
}

async function main(): Promise<ExitStatus> {
  const request = readCommandLine(
    process.argv.slice(2),
    (text) => void stdout.write(text),
    (text) => void stderr.write(text),
    stdout.columns,
  )
  if ('exitStatus' in request) return request.exitStatus
  return run(request, {
    stdout,
    stderr,
    environment: env,
    onInterrupt: (callback) => {
      process.once('SIGINT', () => {
        process.exitCode = 130
        callback()
      })
      process.once('SIGTERM', () => {
        process.exitCode = 130
        callback()
      })
    },
  })
}

try {
  process.exitCode = await main()
} catch (error) {
  const { message, stack } = error instanceof Error ? error : new Error(String(error))
  process.exitCode = defect({ message, stack: stack ?? '' }, (text) => void stderr.write(text), env)
}
