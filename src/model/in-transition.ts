import { StillmarkError } from '../errors/stillmark-error.js'
import type { StateFault } from './exact-fallback.js'
import type { Compilation } from './generated-function.js'

/** A fault of a state, with the transition's place and copy and the state in words. */
export function inTransition(
  { scenario, body, labels, describe }: Compilation,
  index: number,
  label: number | undefined,
  state: ArrayLike<number>,
  fault: StateFault,
): StillmarkError {
  const rule = body.transitions[index]
  const copy = label === undefined ? [] : (labels[label]?.copy ?? [])
  const name = copy.length === 0 ? rule.name : `${rule.name}[${copy.join(', ')}]`
  return new StillmarkError({
    code: fault.code,
    where: { file: scenario.source.file, line: rule.at.line, column: rule.at.column, key: `transitions.${rule.name}` },
    what: `In the state ${describe(state)}, transition "${name}": ${fault.message}`,
    next: fault.next,
  })
}
