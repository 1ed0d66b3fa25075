import { StillmarkError } from '../errors/stillmark-error.js'
import type { CompiledMeasure, VariablesModel } from '../model/model.js'
import type { Classification } from '../recurrence/classification.js'
import { truncateLevels } from './certified-truncation.js'
import type { ExactAnswer, ExactMeasure } from './exact-answer.js'
import { birthDeathCounts, networkCounts } from './product-form.js'
import { countsMeasure } from './solve-unbounded-counts.js'
import type { Growth } from './solve-unbounded-growth.js'
import { levelsMeasure } from './solve-unbounded-levels.js'
import { type MeasureText, textOf } from './solve-unbounded-measures.js'
import { functionalGrowth } from './solve-unbounded-terms.js'
import type { SolveOptions } from './solved-class.js'

/**
 * The exact long-run answer of a model whose states can't be listed.
 *
 * @returns measures with bounds on their error against the numbers as written; undefined where no steady state is proved
 *   or its form is none that can be solved. A measure that can't be bounded is left out, and `method` says why
 * @throws tail-too-heavy, near-balance, too-many-levels, growth-unknown, joint-too-large (limit) where nothing could be
 *   solved; value-not-finite, ratio-of-nothing (input)
 */
export function solveUnbounded(
  model: VariablesModel,
  classification: Classification,
  options: SolveOptions = {},
): ExactAnswer | undefined {
  const { recurrence, grade, structure } = classification
  if (recurrence !== 'positive recurrent' || grade !== 'proved' || structure === undefined) return undefined
  const texts = model.measures.map((_, k) => textOf(model, k))
  const growth = model.measures.reduce<Growth>(
    (largest, measure, k) => higher(largest, growthIn(model, measure, texts[k])),
    [1],
  )
  const { birthDeath } = structure.form === 'levels' ? structure : {}
  if (structure.form === 'birth-death' || birthDeath !== undefined) {
    const counts = birthDeathCounts(
      structure.form === 'birth-death' ? structure : (birthDeath as NonNullable<typeof birthDeath>),
      growth,
    )
    const summed = counts.counts[0].shares.share.length.toLocaleString('en-US')
    return answer(
      model,
      texts,
      options,
      `detailed balance of a birth-death process, ${summed} counts added up`,
      (measure, text) => countsMeasure(model, counts, measure, text),
    )
  }
  if (structure.form === 'network') {
    const counts = networkCounts(structure, model.start, growth)
    return answer(model, texts, options, `product form, ${structure.stations.length} stations`, (measure, text) =>
      countsMeasure(model, counts, measure, text),
    )
  }
  if (structure.form !== 'levels') return undefined
  const kept = truncateLevels(model, structure, growth)
  const solved = `${kept.solved.method}, ${kept.chain.size.toLocaleString('en-US')} states`
  const cut = `levels from ${kept.levels.toLocaleString('en-US')} on cut off, whose share is below ${kept.cutOff.toExponential(0)}`
  return answer(model, texts, options, `${solved}; ${cut}`, (measure, text) =>
    levelsMeasure(model, kept, measure, text),
  )
}

function answer(
  model: VariablesModel,
  texts: readonly MeasureText[],
  options: SolveOptions,
  method: string,
  solve: (measure: CompiledMeasure, text: MeasureText) => ExactMeasure,
): ExactAnswer {
  const measures: Record<string, ExactMeasure> = Object.create(null)
  const left: StillmarkError[] = []
  model.measures.forEach((measure, k) => {
    if (options.signal?.aborted) {
      throw new StillmarkError({ code: 'interrupted', what: 'The solution was stopped.' }, 'interrupted')
    }
    options.onProgress?.(k / model.measures.length)
    try {
      const solved = solve(measure, texts[k])
      if (Number.isFinite(solved.errorBound)) measures[measure.name] = solved
      else throw boundless(measure.name)
    } catch (error) {
      if (!(error instanceof StillmarkError) || error.kind !== 'limit') throw error
      left.push(error)
    }
  })
  if (left.length > 0 && left.length === model.measures.length) throw left[0]
  return { method: [method, ...left.map(({ what }) => what)].join('. '), measures }
}

/** The growth of what a measure averages; of a quantile or a distribution only the shares count. */
function growthIn(model: VariablesModel, measure: CompiledMeasure, text: MeasureText): Growth {
  try {
    switch (measure.kind) {
      case 'average':
      case 'share':
      case 'frequency':
        return functionalGrowth(model, measure.of, text.of, measure.name)
      case 'ratio':
        return higher(
          functionalGrowth(model, measure.top, text.top, measure.name),
          functionalGrowth(model, measure.bottom, text.bottom, measure.name),
        )
      default:
        return [1]
    }
  } catch (error) {
    // Said where the measure itself is solved.
    if (error instanceof StillmarkError && error.kind === 'limit') return [1]
    throw error
  }
}

const higher = (a: Growth, b: Growth): Growth =>
  Array.from({ length: Math.max(a.length, b.length) }, (_, k) => Math.max(a[k] ?? 0, b[k] ?? 0))

const boundless = (name: string) =>
  new StillmarkError(
    {
      code: 'no-bound',
      where: { key: `measures.${name}` },
      what: `No bound on the error of "${name}" was reached.`,
      next: 'Bring the model further from balance.',
    },
    'limit',
  )
