import { describe, expect, test } from 'vitest'
import { readCommandLine } from '../../src/cli/program.js'

function read(...args: string[]) {
  let out = ''
  let complaint = ''
  const request = readCommandLine(
    args,
    (text) => {
      out += text
    },
    (text) => {
      complaint += text
    },
  )
  return { request, out, complaint }
}

describe('what is asked for', () => {
  test('a command with its files and nothing else', () =>
    expect(read('check', 'a.yaml', 'b.yaml').request).toEqual({
      command: 'check',
      files: ['a.yaml', 'b.yaml'],
      options: {},
      json: false,
      quiet: false,
    }))

  test('every option, under the name that the jobs know', () => {
    const line =
      'check a.yaml --set doors=30 --set mean=2 --seed x --workers 2 --replications 8 --run-length 100 --warm-up 5 ' +
      '--confidence 90% --tolerance 1% --report out --json --quiet --max-states 10 --max-memory 1GB --time-limit 1min'
    expect(read(...line.split(' ')).request).toEqual({
      command: 'check',
      files: ['a.yaml'],
      options: {
        set: new Map([
          ['doors', '30'],
          ['mean', '2'],
        ]),
        seed: 'x',
        workers: 2,
        replications: 8,
        runLength: 100,
        warmUp: 5,
        confidence: 0.9,
        tolerance: { kind: 'relative', value: 0.01 },
        maxStates: 10,
        maxMemoryBytes: 1e9,
        timeLimitSeconds: 60,
      },
      reportFolder: 'out',
      json: true,
      quiet: true,
    })
  })

  test('an option value that looks like an option is still a value', () =>
    expect(read('simulate', 'a.yaml', '--seed=--odd').request).toMatchObject({ options: { seed: '--odd' } }))

  test.each(['check', 'classify', 'solve', 'simulate'])('%s takes the common options', (command) =>
    expect(read(command, 'a.yaml', '--seed', 'x', '--replications', '8', '--json').request).toMatchObject({ command }),
  )

  test('--states belongs to solve', () => {
    expect(read('solve', 'a.yaml', '--states').request).toMatchObject({ options: { states: true } })
    expect(read('check', 'a.yaml', '--states').request).toEqual({ exitStatus: 2 })
  })
})

describe('what ends with 2, and how it is said', () => {
  test.each([
    [['chek', 'a.yaml'], "Unknown command 'chek'.\n(Did you mean check?)\n`stillmark -h` lists the commands.\n"],
    [['plan', 'a.yaml'], "Unknown command 'plan'.\n`stillmark -h` lists the commands.\n"],
    [
      ['check', 'a.yaml', '--sed', 'x'],
      "Unknown option '--sed'.\n(Did you mean one of --seed, --set?)\n`stillmark check -h` shows the options.\n",
    ],
    [
      ['check', 'a.yaml', '--toleranse', '1%'],
      "Unknown option '--toleranse'.\n(Did you mean --tolerance?)\n`stillmark check -h` shows the options.\n",
    ],
    [['check'], "Missing required argument 'file'.\n`stillmark check -h` shows the options.\n"],
    [
      ['solve', 'a.yaml', 'b.yaml'],
      "Too many arguments for 'solve'. Expected 1 argument but got 2.\n`stillmark solve -h` shows the options.\n",
    ],
    [
      ['check', 'a.yaml', '--confidence', '95'],
      "Option '--confidence <share>' argument '95' is invalid. It lies between 0 and 1. Did you mean 95%?\n`stillmark check -h` shows the options.\n",
    ],
    [
      ['check', 'a.yaml', '--seed'],
      "Option '--seed <phrase>' argument missing.\n`stillmark check -h` shows the options.\n",
    ],
  ])('%j', (args, complaint) => {
    const read_ = read(...args)
    expect(read_.request).toEqual({ exitStatus: 2 })
    expect(read_.out).toBe('')
    expect(read_.complaint).toBe(complaint)
  })

  test('nothing at all: the commands are shown, where complaints go', () => {
    const { request, out, complaint } = read()
    expect(request).toEqual({ exitStatus: 2 })
    expect(out).toBe('')
    expect(complaint).toContain('check [options] <file...>')
  })
})

describe('help', () => {
  test.each(['check', 'classify', 'solve', 'simulate'])('%s -h: options, exit statuses, an example', (command) => {
    const { request, out, complaint } = read(command, '-h')
    expect(request).toEqual({ exitStatus: 0 })
    expect(complaint).toBe('')
    expect(out).toContain(`Usage: stillmark ${command} `)
    expect(out).toContain('Exit status: 0 ')
    expect(out).toMatch(new RegExp(`Example:\n {2}stillmark ${command} scenarios/[a-z-]+\\.yaml`))
    for (const line of out.split('\n')) expect(line.length).toBeLessThanOrEqual(80)
  })

  test('every example that help shows can be read', () => {
    for (const command of ['check', 'classify', 'solve', 'simulate']) {
      const example = /Example:\n {2}stillmark (.*)\n/.exec(read(command, '-h').out)?.[1] ?? ''
      expect(read(...example.split(' ')).request).toMatchObject({ command })
    }
  })

  test('options of a run are not advertised where nothing is run', () => {
    expect(read('solve', '-h').out).not.toContain('--replications')
    expect(read('check', '-h').out).toContain('--replications')
  })

  test('--version is the one of the package', async () => {
    const { version } = (await import('../../package.json', { with: { type: 'json' } })).default
    expect(read('--version')).toEqual({ request: { exitStatus: 0 }, out: `${version}\n`, complaint: '' })
  })
})
