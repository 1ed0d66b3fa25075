import type { Chain } from '../chain/chain.js'
import { shownState } from '../chain/shown-state.js'
import type { ExactAnswer } from '../stationary/exact-answer.js'
import type { ExactPart, StillmarkDocument } from './document.js'

/** States that `--states` lists at most. */
export const mostListedStates = 100_000

/** The exact answer as the document shows it, or null with the reason beside it. */
export function exactPart(
  exact: ExactAnswer | undefined,
  absent: string,
  states?: Chain,
): Pick<StillmarkDocument, 'exact' | 'exactAbsent'> {
  if (exact === undefined) return { exact: null, exactAbsent: absent }
  const part: ExactPart = { method: exact.method, measures: exact.measures }
  if (states === undefined || exact.shares === undefined) return { exact: part }
  const { shares } = exact
  const listed = Math.min(states.size, mostListedStates)
  const distribution = Array.from({ length: listed }, (_, i) => [shownState(states, i), shares[i]] as const)
  return { exact: { ...part, distribution } }
}
