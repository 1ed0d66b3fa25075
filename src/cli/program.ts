import { createRequire } from 'node:module'
import { Command, CommanderError, type Help, Option } from 'commander'
import type { CommandName } from '../jobs/document.js'
import type { JobOptions } from '../jobs/options.js'
import * as read from './arguments.js'

/** What the command line asks for. */
export interface Request {
  readonly command: CommandName
  readonly files: readonly string[]
  readonly options: Omit<JobOptions, 'signal' | 'onProgress'>
  readonly reportFolder?: string
  readonly json: boolean
  readonly quiet: boolean
}

/** Nothing is to be run: help or the version was shown (0), or the command line can't be used (2). */
export interface Ended {
  readonly exitStatus: 0 | 2
}

export const version: string = createRequire(import.meta.url)('../../package.json').version

interface CommandText {
  readonly name: CommandName
  readonly does: string
  readonly several: boolean
  /** Whether it simulates: options of the run are shown only there. */
  readonly runs: boolean
  readonly ends: string
  readonly example: string
}

const commands: readonly CommandText[] = [
  {
    name: 'check',
    does: 'Decide whether the model has a long-run answer, compute it exactly, simulate it, and say whether they agree.',
    several: true,
    runs: true,
    ends: `0 agreement (or what "expect" says)
             1 disagreement, or no steady state
             2 the input can't be used · 3 undecided at this run length
             4 a limit was reached · 130 interrupted
             With several files: the first of 130, 2, 4, 1, 3, 0 that occurred.`,
    example: 'stillmark check scenarios/parcel-lockers.yaml --set doors=30 --report out',
  },
  {
    name: 'classify',
    does: 'Decide structure and recurrence, with the proof. Nothing is simulated.',
    several: false,
    runs: false,
    ends: `0 decided · 1 "expect" is contradicted · 3 the class stays open
             2 the input can't be used · 4 a limit was reached
             130 interrupted`,
    example: 'stillmark classify scenarios/shift-rota.yaml',
  },
  {
    name: 'solve',
    does: 'Compute every long-run measure exactly, with a bound on its error. Nothing is simulated.',
    several: false,
    runs: false,
    ends: `0 solved · 1 no steady state, or "expect" is contradicted
             3 the class stays open · 2 the input can't be used
             4 a limit was reached · 130 interrupted`,
    example: 'stillmark solve scenarios/parcel-lockers.yaml --states',
  },
  {
    name: 'simulate',
    does: 'Run seeded replications on all cores and make intervals. Nothing is solved.',
    several: false,
    runs: true,
    ends: `0 simulated · 3 it is open whether there is a long-run answer
             2 the input can't be used · 4 a limit was reached
             130 interrupted`,
    example: 'stillmark simulate scenarios/parcel-lockers.yaml --seed monday',
  },
]

const modelGroup = 'The model:'
const runGroup = 'The run:'
const outputGroup = 'The output:'
const limitsGroup = 'Limits:'

function addOptions(command: Command, { runs, name }: CommandText): void {
  const add = (group: string, flags: string, text: string, parser?: (text: string, before: never) => unknown) => {
    const option = new Option(flags, text).helpGroup(group)
    if (parser !== undefined) option.argParser(parser as (text: string, before: unknown) => never)
    // Common options are taken by every command; where they bear on nothing they are not advertised.
    if (group === runGroup && !runs) option.hideHelp()
    command.addOption(option)
  }
  add(modelGroup, '--set <name=value>', 'override a constant of the file (repeatable)', read.setConstant)
  if (name === 'solve') add(modelGroup, '--states', 'list the long-run share of every state (up to 100,000)')
  add(runGroup, '--seed <phrase>', 'same seed, same digits, on any number of workers', read.seed)
  add(runGroup, '--workers <number>', 'threads (default: one a core)', read.workers)
  add(runGroup, '--replications <number>', 'independent runs', read.replications)
  add(runGroup, '--run-length <time>', 'time units that each of them observes', read.runLength)
  add(runGroup, '--warm-up <time>', 'auto, time units deleted before, or the name of a rule', read.warmUp)
  add(runGroup, '--confidence <share>', 'of the intervals and verdicts: 0.95 or 95%', read.confidence)
  add(runGroup, '--tolerance <size>', 'difference that matters: 2% of the exact value, or a number', read.tolerance)
  add(outputGroup, '--report <folder>', 'write NAME.md and NAME.json there')
  add(outputGroup, '--json', 'one JSON document on standard output, nothing else there')
  add(outputGroup, '--quiet', 'no progress and no notes on standard error, errors only')
  add(limitsGroup, '--max-states <number>', 'states that are listed at most (default: 5,000,000)', read.maxStates)
  add(limitsGroup, '--max-memory <size>', 'memory of the exact solution (default: 4GB)', read.memory)
  add(limitsGroup, '--time-limit <time>', 'stop after 90s, 10min, 2h', read.duration)
}

/** Reads the command line (without node and script). Help goes to `out`, complaints to `complain`. */
export function readCommandLine(
  args: readonly string[],
  out: (text: string) => void,
  complain: (text: string) => void,
  columns?: number,
): Request | Ended {
  let request: Request | undefined
  const program = new Command('stillmark')
  const style = (command: Command): Command =>
    command
      .exitOverride()
      .helpOption('-h, --help', 'show this help')
      .configureHelp({ helpWidth: Math.min(columns ?? 80, 100), sortSubcommands: false } satisfies Partial<Help>)
      .configureOutput({
        writeOut: out,
        writeErr: complain,
        outputError: (text, write) => write(inOurWords(text)),
        getOutHasColors: () => false,
        getErrHasColors: () => false,
      })
  style(program)
    .description('Does this model have a long-run answer, what is it, and does the simulation give it?')
    .version(version, '--version', 'show the version')
    .showHelpAfterError('`stillmark -h` lists the commands.')
    .helpCommand(false)
    .addHelpText('after', `\nExample:\n  stillmark check scenarios/parcel-lockers.yaml\n`)
  for (const text of commands) {
    const command = style(program.command(text.name))
      .description(text.does)
      .argument(text.several ? '<file...>' : '<file>', text.several ? 'scenario files' : 'a scenario file')
      .showHelpAfterError(`\`stillmark ${text.name} -h\` shows the options.`)
      .addHelpText(
        'after',
        `\nExit status: ${text.ends}\n\nErrors go to standard error as text, with --json too: standard output then\nstays empty.\n\nExample:\n  ${text.example}\n`,
      )
      .action((files: string | string[], options: Record<string, unknown>) => {
        request = requestOf(text.name, [files].flat(), options)
      })
    addOptions(command, text)
  }
  try {
    program.parse(args, { from: 'user' })
  } catch (error) {
    if (error instanceof CommanderError) return { exitStatus: error.exitCode === 0 ? 0 : 2 }
    throw error
  }
  return request ?? { exitStatus: 2 }
}

/** "error: unknown option '--sed'" → "Unknown option '--sed'." */
function inOurWords(text: string): string {
  const bare = text.replace(/^error: /, '')
  const [first, ...rest] = `${bare.charAt(0).toUpperCase()}${bare.slice(1)}`.trimEnd().split('\n')
  return `${[/[.?!)]$/.test(first) ? first : `${first}.`, ...rest].join('\n')}\n`
}

function requestOf(command: CommandName, files: readonly string[], given: Record<string, unknown>): Request {
  const { report, json, quiet, set, maxMemory, timeLimit, ...same } = given
  return {
    command,
    files,
    options: {
      ...(same as Request['options']),
      ...(set === undefined ? {} : { set: set as ReadonlyMap<string, string> }),
      ...(maxMemory === undefined ? {} : { maxMemoryBytes: maxMemory as number }),
      ...(timeLimit === undefined ? {} : { timeLimitSeconds: timeLimit as number }),
    },
    ...(report === undefined ? {} : { reportFolder: report as string }),
    json: json === true,
    quiet: quiet === true,
  }
}
