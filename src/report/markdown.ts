import type { JobResult } from '../jobs/job-result.js'
import { distributionTexts } from './distribution-lines.js'
import { factLines } from './facts.js'
import { nextAction } from './next-action.js'
import { plainText } from './plain-text.js'
import { resultRows, whyNoIntervals } from './result-rows.js'
import { verdictSentence } from './verdict-sentence.js'

/** What ran: for the sign-off part of a report. */
export interface Versions {
  readonly stillmark: string
  readonly node: string
}

/** A result as Markdown that reads well in a code review. The same result gives the same text, but for the timing. */
export function toMarkdown(result: JobResult, versions: Versions): string {
  const { document, details } = result
  const { scenario, comparison, simulation, structure, exact } = document
  const parts: string[] = [`# ${escaped(scenario.title)}`]
  const sentence = verdictSentence(document, details)
  if (sentence !== '') parts.push(`**${escaped(sentence)}**`)
  const rows = resultRows(document, details)
  if (rows.length > 0) {
    parts.push(
      table(
        ['measure', 'exact', 'simulated', 'differs', 'allowed', 'verdict', 'note'],
        rows.map((row) => [
          row.measure,
          row.exact,
          row.halfWidth === '' ? row.estimate : `${row.estimate} ± ${row.halfWidth}`,
          row.differs,
          row.allowed,
          row.verdict,
          row.note,
        ]),
        [false, true, true, true, true, false, false],
      ),
    )
  }
  const reason = whyNoIntervals(document)
  if (reason !== undefined) parts.push(`No intervals: ${escaped(reason)}.`)
  for (const { heading, lines } of distributionTexts(document))
    parts.push(escaped(heading), fenced(lines.join('\n'), 'text'))
  const findings = comparison?.findings ?? document.findings ?? []
  if (findings.length > 0) parts.push('## Findings')
  for (const finding of findings) {
    parts.push(
      `### ${escaped(finding.says)}`,
      escaped(finding.evidence),
      `Next: ${escaped(finding.next)} (\`${finding.code}\`)`,
    )
  }
  parts.push(`**Next:** ${escaped(nextAction(result))}`)
  parts.push(
    '## What it rests on',
    table(
      ['', ''],
      factLines(document, details).map(([label, text]) => [label, text]),
      [false, false],
    ),
  )
  const settings: [string, string][] = [
    ['scenario file', scenario.file],
    ['SHA-256 of the file', scenario.sha256],
    ...[...details.overrides].map(([name, value]): [string, string] => [
      'constant set from outside',
      `${name} = ${value}`,
    ]),
    ...(simulation === undefined
      ? []
      : ([
          ['seed', simulation.seed],
          ['replications', String(simulation.replications)],
          ['warm-up', `${simulation.warmUp} (${simulation.warmUpRule})`],
          ['run length', `${simulation.runLength} (${details.runLengthBasis ?? 'as given'})`],
        ] as [string, string][])),
    ...(details.confidence === undefined
      ? []
      : ([['confidence', `${100 * details.confidence} %`]] as [string, string][])),
    ...(exact === undefined || exact === null ? [] : ([['exact answer by', exact.method]] as [string, string][])),
    ...(structure === undefined
      ? []
      : ([['class', `${structure.recurrence}, ${structure.grade}`]] as [string, string][])),
    ['Stillmark', versions.stillmark],
    ['Node', versions.node],
  ]
  parts.push('## Settings', table(['', ''], settings, [false, false]))
  if (simulation !== undefined) {
    parts.push(
      '## Methods',
      table(
        ['measure', 'interval'],
        Object.entries(simulation.measures).map(([name, each]) => [name, `${each.method}, ${100 * each.confidence} %`]),
        [false, false],
      ),
    )
  }
  parts.push(
    '## Cautions',
    'A simulation that agrees with its model says nothing about whether the model fits the plant: rates, independence and rules are the modeller’s. Where people can be hurt, local codes and licensed practice decide.',
    '## Scenario',
    fenced(details.scenarioText, 'yaml'),
  )
  return `${parts.join('\n\n')}\n`
}

function table(head: readonly string[], rows: readonly (readonly string[])[], right: readonly boolean[]): string {
  const used = head.map((_, i) => i === 0 || rows.some((row) => row[i] !== ''))
  const line = (cells: readonly string[]) => `| ${cells.filter((_, i) => used[i]).join(' | ')} |`
  return [
    line(head),
    line(right.map((each) => (each ? '--:' : '---'))),
    ...rows.map((row) => line(row.map(escaped))),
  ].join('\n')
}

/** A stranger's text as text: nothing in it is markup, a link or a table. */
function escaped(text: string): string {
  return plainText(text, 2000)
    .replace(/[\\`*_{}[\]<>|~#]/g, (mark) => `\\${mark}`)
    .replace(/&/g, '&amp;')
    .replace(/:\/\/|www\./gi, (start) => `${start.slice(0, -1)}\\${start.slice(-1)}`)
}

/** A block that its content can't end: its fence is longer than any run of backticks in it. */
function fenced(text: string, language: 'yaml' | 'text'): string {
  const longest = Math.max(2, ...(text.match(/`+/g) ?? []).map((run) => run.length))
  const fence = '`'.repeat(longest + 1)
  const clean = text.replace(/\r\n?/g, '\n').replace(/(?![\t\n])\p{Cc}|[\u202A-\u202E\u2066-\u2069]/gu, '')
  return `${fence}${language}\n${clean.trimEnd()}\n${fence}`
}
