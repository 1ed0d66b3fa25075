import { spawn } from 'node:child_process'
import { mkdtempSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { describe, expect, test } from 'vitest'

// The built program, as it is started from a shell.

interface Ended {
  readonly status: number | null
  readonly out: string
  readonly err: string
}

const program = 'dist/cli/stillmark.js'

function start(args: readonly string[], environment: Record<string, string> = {}) {
  const child = spawn(process.execPath, [program, ...args], { env: { ...process.env, ...environment } })
  const ended = new Promise<Ended>((resolve) => {
    let out = ''
    let err = ''
    child.stdout.on('data', (text) => {
      out += text
    })
    child.stderr.on('data', (text) => {
      err += text
    })
    child.on('close', (status) => resolve({ status, out, err }))
  })
  return { child, ended }
}
const stillmark = (...args: string[]): Promise<Ended> => start(args).ended

const folder = () => mkdtempSync(join(tmpdir(), 'stillmark-'))
function scenario(text: string, name = 'scenario.yaml'): string {
  const file = join(folder(), name)
  writeFileSync(file, text)
  return file
}

/** Exact: lit 2/3 of the time. */
const lamp = (more = ''): string =>
  scenario(`stillmark: 1
title: A lamp
time: continuous
states: [on, off]
rates: { on: { off: 1 }, off: { on: 2 } }
measures: { lit: { share: [on] } }
${more}`)

const quick = ['--run-length', '2000', '--seed', 'x']

describe('exit statuses', () => {
  test('0: agreement', async () => {
    const { status, out, err } = await stillmark(
      'check',
      lamp('claims: { lit: { value: 2/3, tolerance: 1% } }'),
      ...quick,
    )
    expect({ status, err }).toEqual({ status: 0, err: '' })
    expect(out).toContain('The simulation agrees with the exact long-run answer, and so does the claim.')
    expect(out).toContain('0.666667')
  })

  test('1: a claim is off', async () => {
    const { status, out } = await stillmark('check', lamp('claims: { lit: { value: 0.7, tolerance: 1% } }'), ...quick)
    expect(status).toBe(1)
    expect(out).toContain('but the claim is off')
  })

  test('1: what the file expects is contradicted', async () => {
    const { status, out } = await stillmark('classify', lamp('expect: transient'))
    expect(status).toBe(1)
    expect(out).toContain('not transient as the file expects')
  })

  test('2: no such file, said without a stack trace', async () =>
    expect(await stillmark('check', 'no-such-file.yaml')).toEqual({
      status: 2,
      out: '',
      err: 'no-such-file.yaml  There is no such file.\n  Check the name and the folder.\n',
    }))

  test('2: all faults of a file at once, each with its place', async () => {
    const file = scenario(
      'stillmark: 1\ntitle: T\ntime: continuous\nstate: { n: { from: 0, to: 3, start: 0 } }\ntransitions:\n' +
        '  up: { when: m < 3, rate: 1, then: { n: n + 1 } }\n  down: { when: n > 0, rate: speed, then: { n: n - 1 } }\n',
    )
    const { status, out, err } = await stillmark('solve', file)
    expect({ status, out }).toEqual({ status: 2, out: '' })
    expect(err).toContain(`${file}:6:15  "m" is not a constant, quantity or state variable.`)
    expect(err).toContain(`${file}:7:30  "speed" is not a constant, quantity or state variable.`)
    expect(err).not.toMatch(/\n\s+at /)
  })

  test('2: an option that is not known', async () =>
    expect((await stillmark('check', 'a.yaml', '--fast')).status).toBe(2))

  test('3: undecided at this run length', async () => {
    const { status, out } = await stillmark(
      'check',
      lamp(),
      '--run-length',
      '40',
      '--warm-up',
      '0',
      '--tolerance',
      '0.01%',
    )
    expect(status).toBe(3)
    expect(out).toContain('Undecided')
  })

  test('4: a limit', async () => {
    const { status, err } = await stillmark('solve', 'scenarios/parcel-lockers.yaml', '--max-states', '5')
    expect(status).toBe(4)
    expect(err).toContain('--max-states')
  })

  test('of several files the gravest: 2 before 1 before 0, and each is answered', async () => {
    const { status, out, err } = await stillmark(
      'check',
      lamp(),
      'no-such-file.yaml',
      lamp('expect: transient'),
      ...quick,
    )
    expect(status).toBe(2)
    expect(out.match(/^A lamp$/gm)).toHaveLength(2)
    expect(out).toMatch(/3 files\n {2}good .*\n {2}not usable .*\n {2}not good .*\n$/)
    expect(err).toContain('no-such-file.yaml')
  })

  test('130: interrupted while it simulates, soon, and said in one line', async () => {
    const { child, ended } = start(['simulate', lamp(), '--run-length', '1e9', '--warm-up', '0'])
    setTimeout(() => child.kill('SIGINT'), 2500)
    const begun = performance.now()
    const { status, out, err } = await ended
    expect({ status, out }).toEqual({ status: 130, out: '' })
    expect(err).toBe('Interrupted: nothing is kept of the job that ran.\n')
    expect(performance.now() - begun).toBeLessThan(10_000)
  })
})

describe('--json', () => {
  test('one document, indented, and nothing else on standard output', async () => {
    const { status, out, err } = await stillmark('solve', lamp(), '--json')
    expect({ status, err }).toEqual({ status: 0, err: '' })
    const document = JSON.parse(out)
    expect(document).toMatchObject({ format: 'stillmark/solve/1', scenario: { title: 'A lamp' } })
    expect(document.exact.measures.lit.value).toBeCloseTo(2 / 3, 14)
    expect(out).toMatch(/^\{\n {2}"format"/)
  })

  test('of several files one document a line; a file that can not be used has none', async () => {
    const { status, out, err } = await stillmark('check', lamp(), 'no-such-file.yaml', lamp(), ...quick, '--json')
    expect(status).toBe(2)
    const lines = out.trimEnd().split('\n')
    expect(lines.map((line) => JSON.parse(line).comparison.verdict)).toEqual(['agrees', 'agrees'])
    expect(err).toContain('There is no such file.')
  })

  test('the same seed gives the same document on one worker and on two', async () => {
    const file = lamp()
    const document = async (workers: string) => {
      const { simulation, ...rest } = JSON.parse(
        (await stillmark('check', file, ...quick, '--workers', workers, '--json')).out,
      )
      return { ...rest, measures: simulation.measures, events: simulation.events }
    }
    expect(await document('1')).toEqual(await document('2'))
  })
})

describe('output', () => {
  test('is plain when piped: no escape codes, no progress', async () => {
    const { out, err } = await stillmark('check', lamp(), ...quick)
    expect(out).not.toMatch(/(?!\n)\p{Cc}/u)
    expect(err).toBe('')
  })

  test('a hostile title does not reach the terminal', async () => {
    const file = scenario(
      `stillmark: 1\ntitle: "\\e]0;x\\a\\e[2J<b> \\u202E"\ntime: continuous\nstates: [a, b]\nrates: { a: { b: 1 }, b: { a: 1 } }\n`,
    )
    expect((await stillmark('classify', file)).out).toMatch(/^\]0;x\[2J<b>\n/)
  })

  test('a reader that has seen enough is no fault', async () => {
    const { child, ended } = start(['solve', 'scenarios/parcel-lockers.yaml', '--states', '--json'])
    child.stdout.destroy()
    const { status, err } = await ended
    expect({ status, err }).toEqual({ status: 0, err: '' })
  })

  test('--report writes both files under the name of the scenario and says so, unless it is to be quiet', async () => {
    const out = join(folder(), 'reports')
    const first = await stillmark('check', lamp(), ...quick, '--report', out)
    expect(first.err).toBe(`Report: ${out}/scenario.md and .json\n`)
    expect(readdirSync(out).sort()).toEqual(['scenario.json', 'scenario.md'])
    expect(JSON.parse(readFileSync(join(out, 'scenario.json'), 'utf8')).format).toBe('stillmark/check/1')
    expect(readFileSync(join(out, 'scenario.md'), 'utf8')).toMatch(/^# A lamp\n/)
    expect((await stillmark('check', lamp(), ...quick, '--report', out, '--quiet')).err).toBe('')
  })

  test('a folder that can not be made ends with 2 before anything runs', async () => {
    const { status, out, err } = await stillmark('check', lamp(), '--report', '/proc/reports')
    expect({ status, out }).toEqual({ status: 2, out: '' })
    expect(err).toContain(`The report can't be written to "/proc/reports"`)
  })
})
