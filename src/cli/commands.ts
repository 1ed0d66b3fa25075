import { readFileSync } from 'node:fs'
import { Command, Option } from 'commander'
import type { CommandName } from '../jobs/document.js'
import type { JobOptions } from '../jobs/options.js'
import { assignment, bytes, confidence, duration, positive, tolerance, warmUp, wholeNumber } from './arguments.js'

/** What the command line asks for. */
export interface Request {
  readonly command: CommandName
  readonly files: readonly string[]
  readonly options: JobOptions
  readonly json: boolean
  readonly quiet: boolean
  readonly report?: string
}

export const version: string = JSON.parse(readFileSync(new URL('../../package.json', import.meta.url), 'utf8')).version

interface Given {
  readonly set?: ReadonlyMap<string, string>
  readonly seed?: string
  readonly workers?: number
  readonly replications?: number
  readonly runLength?: number
  readonly warmUp?: number | string
  readonly confidence?: number
  readonly tolerance?: JobOptions['tolerance']
  readonly maxStates?: number
  readonly maxMemory?: number
  readonly timeLimit?: number
  readonly states?: boolean
  readonly report?: string
  readonly json?: boolean
  readonly quiet?: boolean
}

/** The commands; `run` is called with what was asked for. */
export function stillmarkCommand(run: (request: Request) => Promise<void>): Command {
  const program = new Command('stillmark')
    .description(
      'Decides whether a stochastic simulation can be trusted: does the model have a long-run answer,\nwhat is it exactly, and does the simulation give it?',
    )
    .version(version, '-V, --version', 'show the version')
    .helpOption('-h, --help', 'show this help')
    .helpCommand(false)
    .showHelpAfterError('(-h shows what is possible)')
    .exitOverride()
    .addHelpText(
      'after',
      `
Example:
  stillmark check scenarios/parcel-lockers.yaml

Exit status: 0 agreement (or the divergence that the file expects), 1 disagreement or no steady
state, 2 unusable input, 3 undecided at this run length, 4 a limit was reached, 130 interrupted.`,
    )
  const add = (name: CommandName, argument: string, summary: string, example: string): Command => {
    const command = program
      .command(name)
      .summary(summary)
      .description(`${summary.charAt(0).toUpperCase()}${summary.slice(1)}.`)
      .argument(argument, 'scenario file, YAML or JSON')
      .helpOption('-h, --help', 'show this help')
      .addOption(new Option('--set <name=value>', 'override a constant of the file (repeatable)').argParser(assignment))
    if (name === 'check' || name === 'simulate') addRunOptions(command)
    command
      .addOption(
        new Option('--max-states <n>', 'states that are listed at most (5,000,000)').argParser(wholeNumber(1, 2e9)),
      )
      .addOption(new Option('--max-memory <size>', 'memory for states and solution (4GB)').argParser(bytes))
      .addOption(new Option('--time-limit <time>', 'stop after this time, such as 10min').argParser(duration))
      .option('--report <folder>', 'write NAME.md and NAME.json there')
      .option('--json', 'one JSON document on standard output, nothing else there;\nerrors are text on standard error')
      .option('--quiet', 'no progress, and no text where --json or --report is given')
      .exitOverride()
      .showHelpAfterError('(-h shows what is possible)')
      .addHelpText('after', `\nExample:\n  ${example}`)
      .action(async (files: string | string[], given: Given) => {
        await run({
          command: name,
          files: Array.isArray(files) ? files : [files],
          options: optionsOf(given),
          json: given.json ?? false,
          quiet: given.quiet ?? false,
          ...(given.report === undefined ? {} : { report: given.report }),
        })
      })
    return command
  }
  add(
    'check',
    '<file...>',
    'decide, solve, simulate and compare: the main job',
    'stillmark check scenarios/parcel-lockers.yaml --set doors=30 --tolerance 1%',
  )
  add('classify', '<file>', 'structure and recurrence, with the proof', 'stillmark classify scenarios/shift-rota.yaml')
  add(
    'solve',
    '<file>',
    'exact long-run measures with error bounds',
    'stillmark solve scenarios/parcel-lockers.yaml --states --json',
  ).option('--states', 'add the distribution over the states to the JSON document\n(at most 100,000 of them)')
  add(
    'simulate',
    '<file>',
    'seeded replications on all cores, with intervals',
    'stillmark simulate scenarios/parcel-lockers.yaml --seed night-shift-7 --replications 32',
  )
  return program
}

function addRunOptions(command: Command): void {
  command
    .option('--seed <phrase>', 'the same phrase gives the same digits')
    .addOption(
      new Option('--workers <n>', 'threads (one a core); no digit depends on it').argParser(wholeNumber(1, 1024)),
    )
    .addOption(new Option('--replications <n>', 'independent runs (16)').argParser(wholeNumber(1, 1_000_000)))
    .addOption(new Option('--run-length <time>', 'time units that each replication observes').argParser(positive))
    .addOption(new Option('--warm-up <time>', 'time units deleted before, auto, or a rule (mser)').argParser(warmUp))
    .addOption(new Option('--confidence <share>', 'of every interval (95%)').argParser(confidence))
    .addOption(
      new Option(
        '--tolerance <size>',
        'the difference that matters: 2% of the exact value,\nor a number in the unit of the measure',
      ).argParser(tolerance),
    )
}

const optionsOf = (given: Given): JobOptions => ({
  set: given.set,
  seed: given.seed,
  workers: given.workers,
  replications: given.replications,
  runLength: given.runLength,
  warmUp: given.warmUp,
  confidence: given.confidence,
  tolerance: given.tolerance,
  maxStates: given.maxStates,
  maxMemoryBytes: given.maxMemory,
  timeLimitSeconds: given.timeLimit,
  states: given.states,
})
