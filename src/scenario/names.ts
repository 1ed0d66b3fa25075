import { closest, distance } from 'fastest-levenshtein'
import type { FunctionName } from './expression.js'

/** Each function with the number of its arguments: least and most. */
export const functions: Readonly<Record<FunctionName, readonly [least: number, most: number]>> = {
  min: [1, 100],
  max: [1, 100],
  floor: [1, 1],
  ceil: [1, 1],
  abs: [1, 1],
  exp: [1, 1],
  log: [1, 1],
  sqrt: [1, 1],
  poisson: [2, 2],
  binomial: [3, 3],
  geometric: [2, 2],
  poisson_tail: [2, 2],
  binomial_tail: [3, 3],
  geometric_tail: [2, 2],
}

export const folds = ['sum', 'max_of', 'min_of'] as const

/** Names that the language keeps for itself. */
const taken = new Set<string>([...Object.keys(functions), ...folds, 'if', 'true', 'false', 'and', 'or', 'not', 'start'])

export const isName = (text: string): boolean => /^[A-Za-z][A-Za-z0-9_]{0,99}$/.test(text)
export const isTaken = (text: string): boolean => taken.has(text)
export const isFunction = (text: string): text is FunctionName => Object.hasOwn(functions, text)
export const isFold = (text: string): text is (typeof folds)[number] => (folds as readonly string[]).includes(text)

/** Why a text is no name, or undefined where it is one. */
export function nameFault(text: string): { readonly what: string; readonly next: string } | undefined {
  if (!isName(text)) {
    return {
      what: `"${text.slice(0, 60)}" is not a name.`,
      next: 'Names are letters, digits and _, beginning with a letter, at most 100 of them.',
    }
  }
  if (isTaken(text))
    return { what: `The name "${text}" is taken by the expression language.`, next: 'Choose another name.' }
  return undefined
}

/** "Did you mean …?" where something is near, else what is allowed. */
export function suggestion(wrong: string, allowed: readonly string[]): string {
  const near = nearest(wrong, allowed)
  if (near !== undefined) return `Did you mean "${near}"?`
  if (allowed.length === 0) return 'There is none to choose from.'
  const shown = allowed.slice(0, 12).join(', ')
  return `Allowed: ${shown}${allowed.length > 12 ? `, … (${allowed.length} in all)` : ''}.`
}

/** At most a third of the letters may differ; case and hyphens count little. */
export function nearest(wrong: string, allowed: readonly string[]): string | undefined {
  if (allowed.length === 0 || wrong.length > 100) return undefined
  const plain = (text: string) => text.toLowerCase().replace(/[-_ ]/g, '')
  const same = allowed.find((each) => plain(each) === plain(wrong))
  if (same !== undefined) return same
  const best = closest(wrong, allowed as string[])
  return distance(wrong, best) <= Math.max(1, Math.floor(wrong.length / 3)) ? best : undefined
}
