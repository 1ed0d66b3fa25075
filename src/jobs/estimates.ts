import type { AnyEstimate } from '../comparison/compare-measure.js'
import { atConfidence, estimateMean } from '../estimation/batch-means.js'
import type { Estimate } from '../estimation/estimate.js'
import { distributionAtConfidence, estimateDistribution, estimateQuantile } from '../estimation/quantile.js'
import { estimateRatio } from '../estimation/ratio.js'
import type { Model } from '../model/model.js'
import type { Observations } from '../simulation/observations.js'
import type { SimulatedMeasure } from './document.js'

/** Estimates of every measure, at a confidence. */
export function estimatesOf(model: Model, observations: Observations, confidence: number): Record<string, AnyEstimate> {
  const { replications } = observations.settings
  const estimates: Record<string, AnyEstimate> = Object.create(null)
  for (const measure of model.measures) {
    const seen = observations.measures[measure.name]
    if (seen.kind === 'mean') estimates[measure.name] = estimateMean(seen.batchMeans, replications, confidence)
    else if (seen.kind === 'ratio') {
      estimates[measure.name] = estimateRatio(seen.top, seen.bottom, replications, confidence)
    } else if (measure.kind === 'quantile') {
      estimates[measure.name] = estimateQuantile(seen, replications, measure.level, confidence)
    } else estimates[measure.name] = estimateDistribution(seen, replications, confidence)
  }
  return estimates
}

/**
 * The same estimates at the confidence of a verdict on several measures; a distribution is adjusted once more for its
 * values. Quantiles are turned round anew, since their interval is no multiple of a standard error.
 */
export function adjustedEstimates(
  model: Model,
  observations: Observations,
  estimates: Readonly<Record<string, AnyEstimate>>,
  confidence: number,
): Record<string, AnyEstimate> {
  const { replications } = observations.settings
  const adjusted: Record<string, AnyEstimate> = Object.create(null)
  for (const measure of model.measures) {
    const own = estimates[measure.name]
    const seen = observations.measures[measure.name]
    if ('points' in own) {
      const values = Math.max(1, own.values.length)
      adjusted[measure.name] = distributionAtConfidence(own, 1 - (1 - confidence) / values)
    } else if (measure.kind === 'quantile' && seen.kind === 'histogram') {
      adjusted[measure.name] = estimateQuantile(seen, replications, measure.level, confidence)
    } else adjusted[measure.name] = atConfidence(own as Estimate, confidence)
  }
  return adjusted
}

/** An estimate as the document shows it. */
export function simulatedMeasure(estimate: AnyEstimate): SimulatedMeasure {
  if ('points' in estimate) {
    const { points, values, confidence, method } = estimate
    return {
      points: points.map((point, i) => [values[i], point.estimate, point.halfWidth ?? 0]),
      halfWidth: points.reduce((widest, point) => Math.max(widest, point.halfWidth ?? 0), 0),
      confidence,
      method,
    }
  }
  return {
    estimate: estimate.estimate,
    halfWidth: estimate.halfWidth ?? null,
    confidence: estimate.confidence,
    method: estimate.noInterval === undefined ? estimate.method : `no interval: ${estimate.noInterval}`,
  }
}
