import type { Chain } from './chain.js'

/** A state as people read it: a table's name, or its variables with arrays as lists. */
export function shownState(chain: Chain, state: number): string | Readonly<Record<string, number | readonly number[]>> {
  if (chain.names !== undefined) return chain.names[state]
  const shown: Record<string, number | number[]> = {}
  for (let i = 0; i < chain.width; i++) {
    const value = chain.values[state * chain.width + i]
    const bracket = chain.elements[i].indexOf('[')
    if (bracket < 0) {
      shown[chain.elements[i]] = value
      continue
    }
    const name = chain.elements[i].slice(0, bracket)
    const list = shown[name]
    if (Array.isArray(list)) list.push(value)
    else shown[name] = [value]
  }
  return shown
}
