import type { Chain, JoinedArcs, Structure } from '../chain/chain.js'
import { explore } from '../chain/explore.js'
import { joinArcs } from '../chain/joined-arcs.js'
import { structureOf } from '../chain/structure.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import { compile } from '../model/compile.js'
import type { Model } from '../model/model.js'
import type { Classification } from '../recurrence/classification.js'
import { classifyCountable } from '../recurrence/classify.js'
import { readScenario } from '../scenario/read-scenario.js'
import type { Scenario } from '../scenario/scenario.js'
import type { StructurePart } from './document.js'
import type { JobOptions, Progress } from './options.js'
import { runDefaults } from './run-defaults.js'
import { countableStructurePart, finiteStructurePart } from './structure-part.js'

/** What every job stands on: the model, its states where they can be listed, and what is known of its long run. */
export interface Ground {
  readonly scenario: Scenario
  readonly model: Model
  readonly part: StructurePart
  /** What theorems say of a model that is unbounded. */
  readonly countable?: Classification
  /** Absent where the model is unbounded. */
  readonly finite?: { readonly chain: Chain; readonly joined: JoinedArcs; readonly structure: Structure }
}

/** Reads the file, compiles it, and decides its structure. */
export async function layGround(
  file: string,
  options: JobOptions,
  onProgress: (progress: Progress) => void,
): Promise<Ground> {
  onProgress({ stage: 'reading' })
  const scenario = await readScenario(file, { overrides: options.set })
  const model = compile(scenario)
  let chain = enumerate(model, options, runDefaults.statesBeforeUnbounded, onProgress)
  if (chain === undefined && model.kind === 'variables') {
    onProgress({ stage: 'structure' })
    const countable = classifyCountable(model)
    // Where no theorem speaks, guards may still bound the model further out.
    if (countable.grade === 'open') chain = enumerate(model, options, runDefaults.statesWhereOpen, onProgress)
    if (chain === undefined) return { scenario, model, countable, part: countableStructurePart(countable) }
  }
  if (chain === undefined) throw new Error('a table is always finite')
  onProgress({ stage: 'structure' })
  const joined = joinArcs(chain)
  const structure = structureOf(chain, joined)
  return { scenario, model, part: finiteStructurePart(chain, structure), finite: { chain, joined, structure } }
}

/**
 * The chain, or undefined where a variable has no bound and its values go on beyond the first so many states. A model whose variables all have bounds is finite, so reaching the cap there is
 * the user's limit and ends the job.
 */
function enumerate(
  model: Model,
  options: JobOptions,
  unboundedCap: number,
  onProgress: (progress: Progress) => void,
): Chain | undefined {
  const bounded = model.kind === 'table' || (model.lower.every(Number.isFinite) && model.upper.every(Number.isFinite))
  const cap = options.maxStates ?? runDefaults.maxStates
  const maxStates = bounded ? cap : Math.min(cap, unboundedCap)
  try {
    return explore(model, {
      maxStates,
      maxMemoryBytes: options.maxMemoryBytes,
      onProgress: (done: number) => onProgress({ stage: 'exploring', done, unit: 'states' }),
    })
  } catch (error) {
    if (!bounded && error instanceof StillmarkError && error.code === 'too-many-states') return undefined
    throw error
  }
}
