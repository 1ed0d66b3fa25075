/** Enumeration of a million states with three transitions each, against the 3 s that the design allows. */
import { explore } from '../../src/chain/explore.js'
import { compile } from '../../src/model/compile.js'
import { parseScenario } from '../../src/scenario/parse-scenario.js'
import type { BenchRow } from './row.js'

const side = 1000
const text = `stillmark: 1
title: Two benches in line with room for 999
time: continuous
constants: { room: ${side - 1} }
state:
  first: { from: 0, to: room }
  second: { from: 0, to: room }
transitions:
  come: { when: first < room, rate: 1.3, then: { first: first + 1 } }
  pass: { when: first > 0 and second < room, rate: 1.7, then: { first: first - 1, second: second + 1 } }
  go: { when: second > 0, rate: 2.5, then: { second: second - 1 } }
measures: { waiting: { average: first } }
`

export function explorationBench(): BenchRow[] {
  const model = compile(parseScenario(text, { file: 'bench.yaml' }))
  const seconds: number[] = []
  let states = 0
  for (let run = 0; run < 5; run++) {
    const begin = performance.now()
    states = explore(model).size
    seconds.push((performance.now() - begin) / 1000)
  }
  if (states !== side * side) throw new Error(`${states} states, not ${side * side}`)
  seconds.sort((a, b) => a - b)
  const median = seconds[2]
  return [
    {
      what: 'exploration, three transitions a state',
      size: `${states.toLocaleString('en-US')} states`,
      ours: `${median.toFixed(2)} s`,
      yardstick: '3 s allowed',
      ratio: 3 / median,
      spread: `${seconds[0].toFixed(2)} to ${seconds[4].toFixed(2)} s`,
    },
  ]
}
