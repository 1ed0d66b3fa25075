/**
 * `npm run bench [-- NAME…]`: one table, each row ours against a named yardstick in the same run.
 * A yardstick that is not on this machine is reported as absent, never left out.
 */
import { cpus } from 'node:os'
import type { BenchRow } from './row.js'

const benches: Record<string, () => Promise<() => Promise<BenchRow[]> | BenchRow[]>> = {
  exploration: async () => (await import('./exploration.js')).explorationBench,
  simulation: async () => (await import('./simulation.js')).simulationBench,
  coverage: async () => (await import('./coverage.js')).coverageBench,
}

const wanted = process.argv.slice(2)
const unknown = wanted.filter((name) => !(name in benches))
if (unknown.length > 0) {
  console.error(`There is no benchmark "${unknown[0]}". There are: ${Object.keys(benches).join(', ')}.`)
  process.exit(2)
}
console.log(`${cpus()[0].model}, ${cpus().length} cores, Node ${process.versions.node}`)
for (const [name, load] of Object.entries(benches)) {
  if (wanted.length > 0 && !wanted.includes(name)) continue
  const rows = await (await load())()
  console.table(rows.map((row) => ({ bench: name, ...row })))
}
