import type { CompiledMeasure, Functional, Model, StateValue } from '../model/model.js'

/** A mean of firings: by label (models by variables) or of moves (tables). */
export type FiringMean = Exclude<Functional, { kind: 'average' }>

/**
 * What the kernels add up: one column for each mean over time, then one for each mean of firings; and values of which
 * the share of time is kept. Equal sides of several measures are not joined: they cost one product a chunk.
 */
export interface Columns {
  readonly averages: readonly StateValue[]
  readonly firings: readonly FiringMean[]
  readonly histograms: readonly StateValue[]
  /** Name of the measure of each histogram. */
  readonly histogramNames: readonly string[]
  readonly measures: readonly MeasureColumns[]
}

/** Where a measure's numbers stand: a column (averages first), or a histogram. */
export type MeasureColumns = { readonly name: string } & (
  | { readonly kind: 'mean'; readonly column: number }
  | { readonly kind: 'ratio'; readonly top: number; readonly bottom: number }
  | { readonly kind: 'histogram'; readonly histogram: number }
)

/** What becomes of quantile and distribution measures: their shares of time, or only the mean of the value. */
export type DistributionsAs = 'shares' | 'means'

export function columnsOf(model: Model, distributionsAs: DistributionsAs): Columns {
  const averages: StateValue[] = []
  const firings: FiringMean[] = []
  const histograms: StateValue[] = []
  const histogramNames: string[] = []
  const isAverage = (of: Functional) => of.kind === 'average'
  const sides = model.measures.flatMap((measure) => sidesOf(measure, distributionsAs))
  const firstFiring = sides.filter(isAverage).length
  const columnFor = (of: Functional) =>
    of.kind === 'average' ? averages.push(of.value) - 1 : firstFiring + firings.push(of) - 1
  const measures = model.measures.map((measure): MeasureColumns => {
    const { name } = measure
    if (measure.kind === 'ratio') {
      return { name, kind: 'ratio', top: columnFor(measure.top), bottom: columnFor(measure.bottom) }
    }
    if ((measure.kind === 'quantile' || measure.kind === 'distribution') && distributionsAs === 'shares') {
      histogramNames.push(name)
      return { name, kind: 'histogram', histogram: histograms.push(measure.value) - 1 }
    }
    return { name, kind: 'mean', column: columnFor(sidesOf(measure, distributionsAs)[0]) }
  })
  return { averages, firings, histograms, histogramNames, measures }
}

/** The long-run means that a measure is made of; none where its shares of time are kept. */
function sidesOf(measure: CompiledMeasure, distributionsAs: DistributionsAs): readonly Functional[] {
  switch (measure.kind) {
    case 'ratio':
      return [measure.top, measure.bottom]
    case 'quantile':
    case 'distribution':
      return distributionsAs === 'means' ? [{ kind: 'average', value: measure.value }] : []
    default:
      return [measure.of]
  }
}
