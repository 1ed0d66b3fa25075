import type { Chain } from '../chain/chain.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { Model, StateValue } from '../model/model.js'
import { aliasTables } from './alias-table.js'
import type { Columns, FiringMean } from './columns.js'
import { histogramBatches } from './histogram-batches.js'
import type { Memory } from './memory.js'
import type { EnumeratedTask, Task } from './task.js'

/** Lays out all that the replications of an enumerated chain read and write. */
export function enumeratedTask(
  task: Task,
  model: Model,
  chain: Chain,
  { averages, firings, histograms, histogramNames }: Columns,
  memory: Memory,
): EnumeratedTask {
  const { replications, batches } = task.settings
  const n = chain.size
  const { cutoff, alias, meanHolding } = aliasTables(chain)
  const values = memory.doubles(n * averages.length)
  averages.forEach((value, column) => {
    eachValue(model, chain, value, (state, x) => {
      values[state * averages.length + column] = x
    })
  })
  const { group, weights } = weightGroups(chain, firings)
  const binned = histograms.map((value) => binsOf(model, chain, value))
  const binBatches = binned.map(({ binValues }, h) =>
    histogramBatches(histogramNames[h], replications, batches, binValues.length),
  )
  return {
    ...task,
    start: chain.start,
    rowStart: memory.hold(chain.rowStart),
    target: memory.hold(chain.target),
    cutoff: memory.hold(cutoff),
    alias: memory.hold(alias),
    meanHolding: memory.hold(meanHolding),
    values,
    valueColumns: averages.length,
    group: memory.hold(group),
    weights,
    firingColumns: firings.length,
    bins: binned.map(({ bins }) => memory.hold(bins)),
    binValues: binned.map(({ binValues }) => binValues),
    binBatches,
    binTimes: binned.map(({ binValues }, h) => memory.doubles(replications * binBatches[h] * binValues.length)),
  }
}

/** Calls `take` with the value in each state of the chain. @throws StillmarkError not-finite */
function eachValue(model: Model, chain: Chain, value: StateValue, take: (state: number, x: number) => void) {
  const { width } = chain
  const vector: number[] = new Array(Math.max(1, width)).fill(0)
  for (let state = 0; state < chain.size; state++) {
    if (width === 0) vector[0] = state
    else for (let k = 0; k < width; k++) vector[k] = chain.values[state * width + k]
    const x = value.valueOf(vector)
    if (!Number.isFinite(x)) {
      const name = model.kind === 'table' ? model.states[state] : model.describe(vector)
      throw new StillmarkError({
        code: 'not-finite',
        what: `A measure has no finite value in the state ${name}.`,
        next: 'Guard the expression with if(condition, a, b).',
      })
    }
    take(state, x)
  }
}

/** The distinct values, ascending, and the place of each state's among them. */
function binsOf(model: Model, chain: Chain, value: StateValue) {
  const places = new Map<number, number>()
  const bins = new Int32Array(chain.size)
  eachValue(model, chain, value, (state, x) => {
    let place = places.get(x)
    if (place === undefined) {
      place = places.size
      places.set(x, place)
    }
    bins[state] = place
  })
  const found = Float64Array.from(places.keys())
  const order = Int32Array.from(found.keys()).sort((a, b) => found[a] - found[b])
  const rank = new Int32Array(found.length)
  for (let k = 0; k < order.length; k++) rank[order[k]] = k
  for (let state = 0; state < bins.length; state++) bins[state] = rank[bins[state]]
  return { bins, binValues: Float64Array.from(order, (k) => found[k]) }
}

/**
 * Arcs that count alike in every column of firings share a row of weights: by label, and for moves of a table by which
 * of the columns they belong to.
 */
function weightGroups(chain: Chain, firings: readonly FiringMean[]) {
  const { size, rowStart, target, label } = chain
  const columns = firings.length
  const group = new Int32Array(target.length)
  const rows: number[] = []
  if (columns === 0) return { group, weights: new Float64Array(0) }
  const known = new Map<string, number>()
  const row: number[] = new Array(columns).fill(0)
  const byLabel = new Map<number, number>()
  const onlyLabels = firings.every(({ kind }) => kind === 'frequency')
  for (let from = 0; from < size; from++) {
    for (let arc = rowStart[from]; arc < rowStart[from + 1]; arc++) {
      const sameLabel = onlyLabels ? byLabel.get(label[arc]) : undefined
      if (sameLabel !== undefined) {
        group[arc] = sameLabel
        continue
      }
      for (let column = 0; column < columns; column++) {
        row[column] = weightOf(firings[column], label[arc], from, target[arc])
      }
      const key = row.join(' ')
      let place = known.get(key)
      if (place === undefined) {
        place = known.size
        known.set(key, place)
        rows.push(...row)
      }
      group[arc] = place
      if (onlyLabels) byLabel.set(label[arc], place)
    }
  }
  return { group, weights: Float64Array.from(rows) }
}

function weightOf(firing: FiringMean, label: number, from: number, to: number): number {
  if (firing.kind === 'frequency') return label < 0 ? 0 : firing.weights[label]
  return (firing.from ?? from) === from && (firing.to ?? to) === to ? 1 : 0
}
