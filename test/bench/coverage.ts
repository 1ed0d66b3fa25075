/**
 * How often the 95 % intervals of the main job hold the exact value: 400 seeds on three scenarios, through the same
 * functions as `check`. An honest procedure is inside 92.25 % to 97.25 % in 98 of 100 such experiments (binomial).
 */
import { check } from '../../src/jobs/check.js'
import type { BenchRow } from './row.js'

const seeds = 400
const scenarios = ['parcel-lockers', 'two-repairers', 'wear-and-inspection']

export async function coverageBench(): Promise<BenchRow[]> {
  const rows: BenchRow[] = []
  for (const name of scenarios) {
    const hits = new Map<string, number>()
    for (let i = 0; i < seeds; i++) {
      const { document } = await check(`scenarios/${name}.yaml`, {
        seed: `coverage-${i}`,
        runLength: 2000,
        warmUp: 100,
        workers: 1,
      })
      for (const [measure, simulated] of Object.entries(document.simulation?.measures ?? {})) {
        const exact = document.exact?.measures[measure]
        if (exact === undefined || !('value' in exact) || simulated.halfWidth === null) continue
        const inside =
          Math.abs((simulated.estimate ?? Number.NaN) - exact.value) <= simulated.halfWidth + exact.errorBound
        hits.set(measure, (hits.get(measure) ?? 0) + (inside ? 1 : 0))
      }
    }
    for (const [measure, count] of hits) {
      rows.push({
        what: `${measure} of ${name}`,
        size: `${seeds} seeds`,
        ours: `${((100 * count) / seeds).toFixed(2)} % covered`,
        yardstick: '95 % stated',
        ratio: count / seeds / 0.95,
      })
    }
  }
  return rows
}
