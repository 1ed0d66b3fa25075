import { createColors } from 'picocolors'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { JobResult } from '../jobs/job-result.js'
import { toJson } from '../report/json.js'
import { toMarkdown } from '../report/markdown.js'
import { plainText } from '../report/plain-text.js'
import { type Paint, terminalText } from '../report/terminal.js'
import { type ExitStatus, joinedStatus, statusOfFault } from './exit-status.js'
import { faultsText } from './fault-text.js'
import { type JobThread, type Outcome, startJobThread } from './job-thread.js'
import { type Request, version } from './program.js'
import { noProgress, progressOn } from './progress.js'
import { sourceLine } from './source-line.js'
import { prepareFolder, reportNames, writeReport } from './write-report.js'

/** Where a run writes to and hears from: the process, or a test. */
export interface Surroundings {
  readonly stdout: NodeJS.WriteStream
  readonly stderr: NodeJS.WriteStream
  readonly environment: Readonly<Record<string, string | undefined>>
  /** Calls back when the user interrupts. */
  onInterrupt(callback: () => void): void
}

/** Runs a command on its files one after another and shows each result as soon as it is there. */
export async function run(request: Request, surroundings: Surroundings): Promise<ExitStatus> {
  const { command, files, options, quiet, json } = request
  const { stdout, stderr, environment } = surroundings
  const complain = (text: string): void => void stderr.write(text)
  if (request.reportFolder !== undefined) {
    try {
      await prepareFolder(request.reportFolder)
    } catch (error) {
      return complainAbout(error, complain)
    }
  }
  const thread = startJobThread()
  surroundings.onInterrupt(() => void thread.stop())
  const names = reportNames(files)
  const progress = stderr.isTTY && !quiet && environment.TERM !== 'dumb' ? progressOn(stderr) : noProgress
  const statuses: ExitStatus[] = []
  try {
    for (const [i, file] of files.entries()) {
      const outcome = await thread.run({ command, file, options }, progress.show)
      progress.clear()
      if (i > 0 && !json && outcome.kind === 'result') stdout.write('\n')
      statuses.push(await show(outcome, names[i], request, surroundings))
      if (outcome.kind === 'interrupted' || outcome.kind === 'defect') break
    }
  } finally {
    progress.clear()
    await (thread as JobThread).stop()
  }
  if (files.length > 1 && !json) stdout.write(`\n${summary(files, statuses)}`)
  return joinedStatus(statuses)
}

async function show(
  outcome: Outcome,
  name: string,
  request: Request,
  { stdout, stderr, environment }: Surroundings,
): Promise<ExitStatus> {
  const complain = (text: string): void => void stderr.write(text)
  if (outcome.kind === 'interrupted') {
    complain('Interrupted: nothing is kept of the job that ran.\n')
    return 130
  }
  if (outcome.kind === 'defect') return defect(outcome, complain, environment)
  if (outcome.kind === 'faults') {
    complain(faultsText(outcome.faults, sourceLine))
    return statusOfFault(outcome.faultKind)
  }
  const { result } = outcome
  if (request.json) stdout.write(`${toJson(result.document, request.files.length === 1)}\n`)
  else stdout.write(terminalText(result, stdout.isTTY ? stdout.columns : undefined, paintFor(stdout, environment)))
  if (request.reportFolder !== undefined) {
    try {
      await writeReport(request.reportFolder, reportFiles(name, result))
    } catch (error) {
      return complainAbout(error, complain)
    }
    if (!request.quiet) complain(`Report: ${plainText(`${request.reportFolder}/${name}`)}.md and .json\n`)
  }
  return result.exitStatus
}

const reportFiles = (name: string, result: JobResult): [string, string][] => [
  [`${name}.md`, toMarkdown(result, { stillmark: version, node: process.versions.node })],
  [`${name}.json`, `${toJson(result.document, true)}\n`],
]

function complainAbout(error: unknown, complain: (text: string) => void): ExitStatus {
  if (!(error instanceof StillmarkError)) throw error
  complain(faultsText(error.faults, sourceLine))
  return statusOfFault(error.kind)
}

/** A fault of the program itself, in one sentence; where it happened only for those who ask. */
export function defect(
  { message, stack }: { readonly message: string; readonly stack: string },
  complain: (text: string) => void,
  environment: Readonly<Record<string, string | undefined>>,
): 70 {
  complain(
    `This is a fault of Stillmark ${version} itself, not of your file: ${plainText(message, 300)}. ` +
      'Please report it with the scenario and this version; STILLMARK_TRACE=1 shows where it happened.\n',
  )
  if (environment.STILLMARK_TRACE === '1') complain(`${stack}\n`)
  return 70
}

/** Colour only on a terminal, and not where the user asked for none (NO_COLOR, TERM=dumb). */
function paintFor(stream: NodeJS.WriteStream, { NO_COLOR, TERM }: Surroundings['environment']): Paint {
  const on = stream.isTTY && !NO_COLOR && TERM !== 'dumb'
  // Off a terminal isTTY is undefined, which the library takes as "decide yourself", and then colours under CI.
  const { bold, dim, green, red, yellow } = createColors(on === true)
  return { strong: bold, quiet: dim, good: green, bad: red, open: yellow }
}

const words: Readonly<Record<ExitStatus, string>> = {
  0: 'good',
  1: 'not good',
  2: 'not usable',
  3: 'undecided',
  4: 'limit reached',
  70: 'fault of the program',
  130: 'interrupted',
}

function summary(files: readonly string[], statuses: readonly ExitStatus[]): string {
  const lines = files.map((file, i) => {
    const status = statuses[i]
    return `  ${(status === undefined ? 'not run' : words[status]).padEnd(20)} ${plainText(file)}`
  })
  return `${files.length} files\n${lines.join('\n')}\n`
}
