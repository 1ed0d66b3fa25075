import { describe, expect, test } from 'vitest'
import { toJson } from '../../src/report/json.js'
import { toMarkdown } from '../../src/report/markdown.js'
import { plainText } from '../../src/report/plain-text.js'
import { agreeing, claimIsOff, hostile, openModel, solvedStates } from './results.js'

const versions = { stillmark: '0.1.0', node: '20.20.2' }

describe('JSON', () => {
  test('reads back to the same document, on one line or indented', () => {
    for (const { document } of [agreeing, hostile, solvedStates]) {
      expect(JSON.parse(toJson(document, true))).toEqual(document)
      expect(JSON.parse(toJson(document, false))).toEqual(document)
      expect(toJson(document, false)).not.toContain('\n')
    }
  })

  test('keeps every digit of a number', () => {
    expect(toJson(agreeing.document, false)).toContain('"value":0.114689155323272')
  })

  test('holds no character that steers a terminal or turns the writing', () => {
    expect(toJson(hostile.document, false)).not.toMatch(/\p{Cc}|[\u202A-\u202E]/u)
  })
})

describe('Markdown', () => {
  const text = toMarkdown(agreeing, versions)

  test('opens with the title and the answer', () => {
    expect(text).toMatch(
      /^# Parcel lockers at a commuter station\n\n\*\*The simulation agrees with the exact long-run answer, and so does the claim\.\*\*\n/,
    )
  })

  test('has a row for each measure and each claim', () => {
    expect(text).toContain('| mean\\_occupied | 19.9195 | 19.921 ± 0.016 | 0.0 % | 2 % | agrees |  |')
    expect(text).toContain('| claim: full | 0.114689 | 0.115 | 0.3 % | 1 % | agrees | capacity spreadsheet, cell F12 |')
  })

  test('holds all that is needed to repeat the run', () => {
    for (const line of [
      `| SHA-256 of the file | ${'ab'.repeat(32)} |`,
      '| constant set from outside | doors = 24 |',
      '| seed | night-shift-7 |',
      '| replications | 16 |',
      '| run length | 20000 (as given) |',
      '| confidence | 95 % |',
      '| Stillmark | 0.1.0 |',
      '| Node | 20.20.2 |',
    ])
      expect(text).toContain(line)
    expect(text).toContain('```yaml\nstillmark: 1\ntitle: Parcel lockers\n```')
  })

  test('says what it does not say', () => {
    expect(text).toContain('says nothing about whether the model fits the plant')
    expect(text).toContain('local codes and licensed practice decide')
  })

  test('tells findings with their evidence and the next action', () => {
    const off = toMarkdown(claimIsOff, versions)
    expect(off).toContain('## Findings\n\n### The claim about full is off')
    expect(off).toContain('The difference is 0.005311 (4.63 %)')
    expect(off).toContain('(`claim-off`)')
    expect(off).toContain('**Next:** Look for what the claim was worked out from')
  })

  test('a model without an answer has no columns for one', () => {
    expect(toMarkdown(openModel, versions)).toContain(
      '| measure | simulated |\n| --- | --: |\n| mean\\_backlog | 139.0 |',
    )
  })

  test('lists distributions', () => expect(toMarkdown(solvedStates, versions)).toContain('   1  ██████████  0.5000'))

  test('a title stays a title: no markup, no control characters, one line', () => {
    const [title] = toMarkdown(hostile, versions).split('\n')
    expect(title).toBe('# \\[31mRed\\[0m \\| \\`tick\\` \\<b\\>x\\</b\\> \\[a\\](http:/\\/x.y) flip second line2J 漢字')
  })

  test('a file name stays in its cell', () => {
    expect(toMarkdown(hostile, versions)).toContain('| scenario file | a\\|b\\`.yaml |')
  })

  test('a scenario text can not end its own block', () => {
    expect(toMarkdown(hostile, versions)).toMatch(/\n`````yaml\ntitle: "```"\n````\n# heading\n\[2J\n`````\n$/)
  })

  test('every row of every table has as many cells as its head', () => {
    for (const result of [agreeing, claimIsOff, hostile, openModel, solvedStates]) {
      let cells = 0
      for (const line of toMarkdown(result, versions).split('\n')) {
        if (!line.startsWith('|')) cells = 0
        else {
          const found = line.replace(/\\\|/g, '').split('|').length
          if (cells !== 0) expect(found).toBe(cells)
          cells = found
        }
      }
    }
  })
})

describe('a stranger’s text', () => {
  test.each([
    ['\u001b[31mred\u001b[0m', '[31mred[0m'],
    ['two\r\nlines\tand a tab', 'two lines and a tab'],
    ['a\u202Eb\u2066c\u200Bd', 'abcd'],
    ['  漢字 😀  ', '漢字 😀'],
  ])('%j is shown as %j', (text, shown) => expect(plainText(text)).toBe(shown))

  test('is cut between characters, not within one', () => expect(plainText('😀😀😀😀', 3)).toBe('😀😀…'))
})
