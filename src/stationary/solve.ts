import type { Chain, ClosedClass, JoinedArcs, Structure } from '../chain/chain.js'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { CompiledMeasure, Functional, Model } from '../model/model.js'
import { closedChain } from './closed-chain.js'
import type { ExactAnswer, ExactMeasure } from './exact-answer.js'
import { distributionOf, quantileOf } from './level-values.js'
import type { BoundedValue, StateFunction } from './mean-value.js'
import { mixedMean, type WeightedClass } from './mixture.js'
import { type SolveOptions, sharesRelativeError, solveClass } from './solved-class.js'
import { stateFunction } from './state-functions.js'

export type { SolveOptions } from './solved-class.js'

/**
 * The exact long-run answer of a finite chain: each closed class that the start can reach is solved on its own, and the
 * classes are mixed by the probabilities of ending in them. Shares are shares of time, so a period changes nothing.
 *
 * @param joined `joinArcs(chain)`
 * @param structure `structureOf(chain, joined)`
 * @returns measures with bounds on their error against the numbers as written. A ratio over several classes is the ratio
 *   of its mixed sides; in `byClass` a ratio is left out where its class never has what it divides by
 * @throws memory-limit, residual-too-large, range-exceeded (limit); interrupted; value-not-finite, ratio-of-nothing (input)
 */
export function solve(
  model: Model,
  chain: Chain,
  joined: JoinedArcs,
  structure: Structure,
  options: SolveOptions = {},
): ExactAnswer {
  const reached = structure.closedClasses.filter((each) => each.reachedWith > 0)
  const total = reached.reduce((sum, each) => sum + each.states.length, 0)
  let before = 0
  const solvedOf = (closed: ClosedClass): WeightedClass => {
    const onProgress = (done: number) => options.onProgress?.((before + done * closed.states.length) / total)
    const solved = solveClass(closedChain(chain, joined, closed), { ...options, onProgress })
    before += closed.states.length
    return { solved, weight: closed.reachedWith, weightError: closed.reachedWithError }
  }
  const classes = reached.map(solvedOf)
  const shares = new Float64Array(chain.size)
  let relativeError = 0
  for (const { solved, weight, weightError } of classes) {
    for (let k = 0; k < solved.share.length; k++) shares[solved.chain.states[k]] = weight * solved.share[k]
    relativeError = Math.max(relativeError, sharesRelativeError(solved) + weightError / weight + 2 ** -53)
  }
  const answer: ExactAnswer = {
    method: methodOf(classes, total),
    measures: measuresOf(model, chain, classes, true),
    shares,
    sharesRelativeError: relativeError,
    solved: classes.map((each) => each.solved),
  }
  if (structure.closedClasses.length === 1 || classes.length === 1) return answer
  return {
    ...answer,
    byClass: structure.closedClasses.map((closed) => {
      const own = classes[reached.indexOf(closed)]
      return own === undefined ? {} : measuresOf(model, chain, [{ ...own, weight: 1, weightError: 0 }], false)
    }),
  }
}

/** "GTH elimination, 25 states". */
function methodOf(classes: readonly WeightedClass[], states: number): string {
  const names = [...new Set(classes.map(({ solved }) => solved.method))].join(' and ')
  const counted = `${states.toLocaleString('en-US')} ${states === 1 ? 'state' : 'states'}`
  const places = classes.length === 1 ? '' : ` in ${classes.length.toLocaleString('en-US')} closed classes`
  return `${names}, ${counted}${places}`
}

/** @param strict a ratio of nothing is an error, not left out */
function measuresOf(
  model: Model,
  chain: Chain,
  classes: readonly WeightedClass[],
  strict: boolean,
): Record<string, ExactMeasure> {
  const measures: Record<string, ExactMeasure> = Object.create(null)
  for (const measure of model.measures) {
    const value = exactMeasure(model, chain, classes, measure)
    if (value !== undefined) measures[measure.name] = value
    else if (strict) throw ratioOfNothing(measure.name)
  }
  return measures
}

function exactMeasure(
  model: Model,
  chain: Chain,
  classes: readonly WeightedClass[],
  measure: CompiledMeasure,
): ExactMeasure | undefined {
  const on = (of: Functional) =>
    classes.map(({ solved }) => stateFunction(chain, solved.chain.states, of, measure.name))
  switch (measure.kind) {
    case 'average':
    case 'share':
    case 'frequency':
      return mixedMean(classes, on(measure.of))
    case 'ratio':
      return ratioOf(classes, on(measure.top), on(measure.bottom))
    case 'quantile':
      return quantileOf(model, chain, classes, measure.value, measure.level, measure.name)
    case 'distribution':
      return distributionOf(chain, classes, measure.value, measure.name)
  }
}

/**
 * With R the ratio of the computed means T and B, the true one is R + mean(top - R·bottom) / true B: so errors that both
 * sides share cancel.
 *
 * @returns undefined where the lower side may be 0
 */
function ratioOf(
  classes: readonly WeightedClass[],
  top: readonly StateFunction[],
  bottom: readonly StateFunction[],
): BoundedValue | undefined {
  const over = mixedMean(classes, top)
  const under = mixedMean(classes, bottom)
  const least = Math.abs(under.value) - under.errorBound
  if (!(least > 0)) return undefined
  const ratio = over.value / under.value
  const missed = mixedMean(
    classes,
    top.map((each, k) => differenceOf(each, bottom[k], ratio)),
  )
  return { value: ratio, errorBound: ((Math.abs(missed.value) + missed.errorBound) / least) * (1 + 2 ** -40) }
}

function differenceOf(top: StateFunction, bottom: StateFunction, ratio: number): StateFunction {
  const value = new Float64Array(top.value.length)
  const error = new Float64Array(top.value.length)
  for (let k = 0; k < value.length; k++) {
    const part = ratio * bottom.value[k]
    value[k] = top.value[k] - part
    const rounding = 2 ** -53 * (Math.abs(part) + Math.abs(value[k]))
    error[k] = (top.error[k] + Math.abs(ratio) * bottom.error[k] + rounding) * (1 + 2 ** -40)
  }
  return { value, error }
}

const ratioOfNothing = (name: string) =>
  new StillmarkError({
    code: 'ratio-of-nothing',
    where: { key: `measures.${name}` },
    what: `The ratio "${name}" divides by something that is 0 in the long run.`,
    next: 'Put below the line what happens or is present in the long run.',
  })
