import type { ExactAnswer } from '../stationary/exact-answer.js'
import { type ClaimToJudge, judgeClaim } from './compare-claim.js'
import { type AnyEstimate, judgeMeasure, type Prediction, type Tolerance } from './compare-measure.js'
import type { JudgedMeasure } from './judged-measure.js'
import { measureFindings, type RunFacts } from './run-findings.js'
import { percent, shown } from './shown-number.js'
import { type StructureFacts, structureFindings } from './structure-findings.js'
import type { ClaimComparison, Comparison, Finding, MeasureComparison, Verdict } from './verdict.js'

export interface RunToCompare {
  readonly exact?: ExactAnswer
  /** At the confidence that is adjusted for the number of measures (`adjustedConfidence`). */
  readonly adjusted: Readonly<Record<string, AnyEstimate>>
  readonly tolerance: Tolerance
  readonly claims: readonly ClaimToJudge[]
  readonly predictions: Readonly<Record<string, Prediction>>
  readonly structure?: StructureFacts
  readonly run: RunFacts
  /** Findings that are causes and come first: an open class, say. */
  readonly causes?: readonly Finding[]
}

/**
 * Confidence at which each of several measures is judged so that all of them together hold at the confidence asked for.
 * Source: Bonferroni's inequality (Dunn 1961, from memory): it needs no independence, which measures of one run lack.
 */
export const adjustedConfidence = (confidence: number, measures: number): number =>
  1 - (1 - confidence) / Math.max(1, measures)

/** Verdicts on measures and claims, and what is to be said about them: the first finding is the cause. */
export function compareRun(input: RunToCompare): Comparison {
  const { exact, adjusted, tolerance, predictions } = input
  const judged: Record<string, JudgedMeasure> = Object.create(null)
  if (exact !== undefined) {
    for (const [name, estimate] of Object.entries(adjusted)) {
      const value = exact.measures[name]
      if (value !== undefined) judged[name] = judgeMeasure(value, estimate, tolerance, predictions[name])
    }
  }
  const claims: Record<string, ClaimComparison> = Object.create(null)
  for (const claim of input.claims)
    claims[claim.measure] = judgeClaim(claim, exact?.measures[claim.measure], adjusted[claim.measure])
  const verdicts: Verdict[] = [...Object.values(judged), ...Object.values(claims)].map((each) => each.verdict)
  const findings = [
    ...(input.causes ?? []),
    ...claimFindings(input.claims, claims, judged, simulatedValues(adjusted)),
    ...(input.structure === undefined ? [] : structureFindings(input.structure, input.run.unit)),
    ...measureFindings(judged, adjusted, predictions, input.run, input.structure),
  ]
  return {
    verdict:
      // Nothing compared is no agreement.
      Object.keys(judged).length === 0 && (exact === undefined || verdicts.length === 0)
        ? overall([...verdicts, 'undecided'])
        : overall(verdicts),
    measures: Object.fromEntries(Object.entries(judged).map(([name, each]) => [name, comparisonOf(each)])),
    claims,
    findings: ordered(findings),
  }
}

const comparisonOf = ({ verdict, difference, tolerance, pValue }: JudgedMeasure): MeasureComparison => ({
  verdict,
  difference,
  tolerance,
  pValue,
})

const overall = (verdicts: readonly Verdict[]): Verdict =>
  verdicts.includes('disagrees') ? 'disagrees' : verdicts.includes('undecided') ? 'undecided' : 'agrees'

/** Causes before what follows from them: what the run could not show comes after what is wrong. */
const order: readonly Finding['code'][] = [
  'explosive', 'outward-drift', 'balanced-drift', 'one-way', 'open-class', 'start-dependent', 'absorbing', 'claim-off',
  'slow-mixing', 'bias-left', 'batches-short', 'simulation-off', 'rare-states', 'too-short', 'harmless-difference', 'periodic',
] // biome-ignore format: one list

const ordered = (findings: readonly Finding[]): Finding[] =>
  [...findings].sort((a, b) => order.indexOf(a.code) - order.indexOf(b.code))

function claimFindings(
  claims: readonly ClaimToJudge[],
  comparisons: Readonly<Record<string, ClaimComparison>>,
  judged: Readonly<Record<string, JudgedMeasure>>,
  simulated: Readonly<Record<string, number>>,
): Finding[] {
  return claims.flatMap((claim) => {
    const { verdict, exact, tolerance } = comparisons[claim.measure]
    if (verdict === 'agrees') return []
    if (verdict === 'undecided') return exact === null ? [] : [claimOnBorder(claim, exact, tolerance)]
    const against = exact ?? simulated[claim.measure]
    const off =
      against === undefined || against === 0 ? '' : ` (${percent(Math.abs(claim.value - against) / Math.abs(against))})`
    const agreement = judged[claim.measure]?.verdict === 'agrees' ? ' The simulation agrees with the exact value.' : ''
    return [
      {
        code: 'claim-off' as const,
        says: `The claim about ${claim.measure} is off: ${claim.written} is claimed${claim.source === undefined ? '' : ` (${claim.source})`}, ${exact === null ? 'the simulation gives' : 'the exact value is'} ${against === undefined ? 'something else' : shown(against, 6)}.`,
        evidence: `The difference is ${against === undefined ? 'larger' : shown(Math.abs(claim.value - against))}${off}; ${shown(tolerance)} is allowed.${agreement}`,
        next: 'Look for what the claim was worked out from: its rates, its number of places, or its formula.',
      },
    ]
  })
}

/** The claim lies where the error of the exact value can't tell it right from wrong. */
const claimOnBorder = (claim: ClaimToJudge, exact: number, tolerance: number): Finding => ({
  code: 'too-short',
  says: `The claim about ${claim.measure} lies on the border of its tolerance, closer than the exact value is known.`,
  evidence: `${claim.written} is claimed, the exact value is ${shown(exact, 9)}, ${shown(tolerance)} is allowed.`,
  next: 'Give the claim with one more digit, or another tolerance.',
})

const simulatedValues = (adjusted: Readonly<Record<string, AnyEstimate>>): Record<string, number> =>
  Object.fromEntries(
    Object.entries(adjusted).flatMap(([name, each]) => ('points' in each ? [] : [[name, each.estimate]])),
  )
