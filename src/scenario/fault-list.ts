import type { Fault } from '../errors/stillmark-error.js'
import type { Spot } from './expression.js'

/** All that is wrong with one file, in the order of its lines. */
export interface FaultList {
  /** `key` as in `transitions.collect.rate`. */
  add(code: string, spot: Spot | undefined, key: string, what: string, next?: string, text?: string): void
  /** Sorted by line and column, one fault a spot. */
  sorted(): readonly Fault[]
  readonly count: number
}

export function newFaultList(file: string): FaultList {
  const faults: Fault[] = []
  const seen = new Set<string>()
  return {
    add(code, spot, key, what, next, text) {
      // One spot is told one thing: what follows from a fault is noise.
      const address = `${spot?.line}:${spot?.column}:${spot === undefined ? key + what : ''}`
      if (seen.has(address)) return
      seen.add(address)
      faults.push({
        code,
        where: { file, line: spot?.line, column: spot?.column, ...(key === '' ? {} : { key }) },
        what,
        ...(next === undefined ? {} : { next }),
        ...(text === undefined ? {} : { text: text.length > 80 ? `${text.slice(0, 77)}…` : text }),
      })
    },
    sorted: () =>
      [...faults].sort(
        (a, b) => (a.where?.line ?? 0) - (b.where?.line ?? 0) || (a.where?.column ?? 0) - (b.where?.column ?? 0),
      ),
    get count() {
      return faults.length
    },
  }
}
