#!/usr/bin/env node
import { CommanderError } from 'commander'
import pc from 'picocolors'
import { StillmarkError } from '../errors/stillmark-error.js'
import { check } from '../jobs/check.js'
import { classify } from '../jobs/classify.js'
import type { CommandName } from '../jobs/document.js'
import type { JobResult } from '../jobs/job-result.js'
import type { JobOptions } from '../jobs/options.js'
import { simulate } from '../jobs/simulate.js'
import { solve } from '../jobs/solve.js'
import { toJson } from '../report/json.js'
import { type Paint, terminalText } from '../report/terminal.js'
import { type Request, stillmarkCommand, version } from './commands.js'
import { progressDisplay } from './progress-bar.js'
import { faultsText } from './show-faults.js'
import { writeReport } from './write-report.js'

const jobs: Readonly<Record<CommandName, (file: string, options: JobOptions) => Promise<JobResult>>> = {
  check,
  classify,
  solve,
  simulate,
}

const unusable = 2
const limitReached = 4
const interrupted = 130
/** A fault of the program itself: EX_SOFTWARE of the BSD conventions. */
const ownFault = 70

/** With several files the status is the first of these that occurred. */
const precedence = [interrupted, ownFault, unusable, limitReached, 1, 3, 0]

// A reader that has seen enough (`| head`) is no fault.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code === 'EPIPE') process.exit(process.exitCode ?? 0)
  throw error
})

process.exitCode = await main(process.argv)

async function main(argv: readonly string[]): Promise<number> {
  const statuses: number[] = []
  try {
    await stillmarkCommand(async (request) => {
      for (const file of request.files) {
        statuses.push(await answer(request, file))
        if (statuses.includes(interrupted)) break
      }
    }).parseAsync(argv)
  } catch (error) {
    if (!(error instanceof CommanderError)) return tell(error)
    return error.exitCode === 0 ? 0 : unusable
  }
  return precedence.find((status) => statuses.includes(status)) ?? 0
}

/** Does the job on one file and shows what came out. @returns the exit status */
async function answer(request: Request, file: string): Promise<number> {
  const { command, options, json, quiet, report } = request
  const progress = progressDisplay(!quiet)
  const controller = new AbortController()
  const stop = () =>
    controller.abort(
      new StillmarkError({ code: 'interrupted', what: 'Interrupted: nothing was decided.' }, 'interrupted'),
    )
  process.once('SIGINT', stop)
  process.once('SIGTERM', stop)
  try {
    const result = await jobs[command](file, { ...options, signal: controller.signal, onProgress: progress.show })
    progress.end()
    const written =
      report === undefined ? [] : await writeReport(report, result, { stillmark: version, node: process.versions.node })
    if (json) process.stdout.write(`${toJson(result.document, request.files.length === 1)}\n`)
    else if (!quiet || report === undefined) {
      const between = request.files.length > 1 && file !== request.files[0] ? '\n' : ''
      process.stdout.write(`${between}${terminalText(result, process.stdout.columns ?? 80, paint())}`)
    }
    if (!json && !quiet) for (const path of written) process.stdout.write(`Written: ${path}\n`)
    return result.exitStatus
  } catch (error) {
    progress.end()
    return tell(error)
  } finally {
    process.removeListener('SIGINT', stop)
    process.removeListener('SIGTERM', stop)
  }
}

/** Tells what went wrong on standard error. @returns the exit status */
function tell(error: unknown): number {
  if (error instanceof StillmarkError) {
    process.stderr.write(faultsText(error))
    return { input: unusable, limit: limitReached, interrupted, internal: ownFault }[error.kind]
  }
  const what = error instanceof Error ? error.message.split('\n')[0] : String(error)
  process.stderr.write(
    `This is a fault of Stillmark ${version} itself, not of your file: ${what}\nPlease report it with the command and the scenario file. STILLMARK_TRACE=1 shows where it happened.\n`,
  )
  if (process.env.STILLMARK_TRACE === '1' && error instanceof Error) process.stderr.write(`${error.stack}\n`)
  return ownFault
}

function paint(): Paint {
  const coloured = process.stdout.isTTY === true && !('NO_COLOR' in process.env)
  const { bold, dim, green, red, yellow } = pc.createColors(coloured)
  return { strong: bold, quiet: dim, good: green, bad: red, open: yellow }
}
