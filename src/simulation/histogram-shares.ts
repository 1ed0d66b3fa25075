import type { ValueTimes } from './expanded-kernel.js'
import { histogramBatches } from './histogram-batches.js'
import type { MeasureObservations, RunSettings } from './observations.js'
import type { EnumeratedTask } from './task.js'

/** Shares of time from the times in the bins of an enumerated chain; batches that were not completed become NaN. */
export function sharesOfBins(task: EnumeratedTask, histogram: number): MeasureObservations {
  const { replications, runLength, batches: all } = task.settings
  const values = task.binValues[histogram]
  const batches = task.binBatches[histogram]
  const length = runLength / batches
  const shares = Float64Array.from(task.binTimes[histogram], (time) => time / length)
  for (let r = 0; r < replications; r++) {
    const whole = Math.floor((task.output.completed[r] * batches) / all)
    shares.fill(Number.NaN, (r * batches + whole) * values.length, (r + 1) * batches * values.length)
  }
  return { kind: 'histogram', values, shares, batches }
}

/** Shares of time from the times at each value, by replication and batch; batches that are missing become NaN. */
export function sharesOfValueTimes(
  { replications, runLength, batches: all }: RunSettings,
  measure: string,
  times: readonly (readonly ValueTimes[])[],
): MeasureObservations {
  const found = new Set<number>()
  for (const byBatch of times) for (const { values } of byBatch) for (const value of values) found.add(value)
  const values = Float64Array.from(found).sort()
  const place = new Map(Array.from(values, (value, k) => [value, k]))
  const batches = histogramBatches(measure, replications, all, values.length)
  const joined = all / batches
  const shares = new Float64Array(replications * batches * values.length)
  const length = runLength / batches
  times.forEach((byBatch, r) => {
    for (let batch = 0; batch < batches; batch++) {
      const row = (r * batches + batch) * values.length
      const parts = byBatch.slice(batch * joined, (batch + 1) * joined)
      if (parts.length < joined) shares.fill(Number.NaN, row, row + values.length)
      for (const part of parts) {
        part.values.forEach((value, k) => {
          shares[row + place.get(value)!] += part.times[k] / length
        })
      }
    }
  })
  return { kind: 'histogram', values, shares, batches }
}
