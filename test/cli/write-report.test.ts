import { mkdtempSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { mkdir } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { describe, expect, test } from 'vitest'
import { prepareFolder, reportNames, writeReport } from '../../src/cli/write-report.js'

const folder = () => mkdtempSync(join(tmpdir(), 'stillmark-'))

describe('names of reports', () => {
  test.each([
    [['a/lockers.yaml'], ['lockers']],
    [
      ['a/lockers.yaml', 'b/lockers.yml', 'LOCKERS.json'],
      ['lockers', 'lockers-2', 'LOCKERS-3'],
    ],
    [['rota.night.yaml'], ['rota.night']],
    [['.yaml'], ['report']],
  ])('%j → %j', (files, names) => expect(reportNames(files)).toEqual(names))
})

describe('writing', () => {
  test('makes the folders on the way and leaves nothing but the report', async () => {
    const deep = join(folder(), 'a', 'b')
    await prepareFolder(deep)
    await writeReport(deep, [
      ['x.md', 'first'],
      ['x.json', '{}'],
    ])
    expect(readdirSync(deep).sort()).toEqual(['x.json', 'x.md'])
    expect(readFileSync(join(deep, 'x.md'), 'utf8')).toBe('first')
  })

  test('a report that stands there is replaced as a whole', async () => {
    const here = folder()
    writeFileSync(join(here, 'x.md'), 'an older and much longer report')
    await writeReport(here, [['x.md', 'new']])
    expect(readFileSync(join(here, 'x.md'), 'utf8')).toBe('new')
  })

  test('one file that can not be written leaves the others as they were', async () => {
    const here = folder()
    writeFileSync(join(here, 'x.md'), 'old')
    await expect(
      writeReport(here, [
        ['x.md', 'new'],
        ['no-such-folder/x.json', '{}'],
      ]),
    ).rejects.toMatchObject({ code: 'report-not-written', kind: 'input' })
    expect(readFileSync(join(here, 'x.md'), 'utf8')).toBe('old')
    expect(readdirSync(here)).toEqual(['x.md'])
  })

  test('a folder in the place of a file is said, not overwritten', async () => {
    const here = folder()
    await mkdir(join(here, 'x.md'))
    await expect(writeReport(here, [['x.md', 'new']])).rejects.toThrow('a folder stands where a file should go')
    expect(readdirSync(here)).toEqual(['x.md'])
  })

  test('a file in the place of the folder is said before anything runs', async () => {
    const here = join(folder(), 'taken')
    writeFileSync(here, '')
    await expect(prepareFolder(here)).rejects.toMatchObject({ code: 'report-not-written' })
    await expect(prepareFolder(join(here, 'below'))).rejects.toMatchObject({ code: 'report-not-written' })
  })
})
