import type { VariablesModel } from '../model/model.js'
import type { Classification } from './classification.js'
import { exploreWithin, growingElements } from './exploration.js'
import { copiesOf } from './moves.js'
import { classifyOneVariable } from './one-variable.js'
import { NotFollowed } from './rational.js'

/** States of the first look at a model. */
const sampleStates = 3000

export function classifyCountable(model: VariablesModel): Classification {
  try {
    const sample = exploreWithin(model, () => true, sampleStates)
    const growing = growingElements(model, sample)
    const copies = copiesOf(model)
    if (growing.length !== 1) throw new NotFollowed(`${growing.length} unbounded`)
    const [{ element, up, down }] = growing
    const directions: (1 | -1)[] = [...(up ? [1 as const] : []), ...(down ? [-1 as const] : [])]
    return classifyOneVariable(model, copies, element, directions, sample)
  } catch (error) {
    if (!(error instanceof NotFollowed)) throw error
    return { recurrence: 'undetermined', grade: 'open', basis: error.why, checked: [], closedClasses: [], remedies: [] }
  }
}
