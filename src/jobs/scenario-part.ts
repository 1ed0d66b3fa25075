import { toNumber } from '../numbers/fraction.js'
import type { Scenario } from '../scenario/scenario.js'
import type { ScenarioPart } from './document.js'
import type { JobDetails } from './job-result.js'
import type { RunRequest } from './run-request.js'

export const scenarioPart = ({ title, source }: Scenario): ScenarioPart => ({
  title,
  file: source.file,
  sha256: source.sha256,
})

/** What every job tells beyond the contract. */
export function detailsOf(scenario: Scenario, next: string, request?: RunRequest): JobDetails {
  const { unit, time, source, expect, claims } = scenario
  return {
    unit,
    time,
    scenarioText: source.text,
    overrides: source.overrides,
    ...(request === undefined
      ? {}
      : {
          confidence: request.confidence,
          tolerances: Object.fromEntries(scenario.measures.map(({ name }) => [name, request.tolerance])),
        }),
    claims: Object.fromEntries(
      claims.map((claim) => [
        claim.measure,
        { written: claim.written, ...(claim.source === undefined ? {} : { source: claim.source }) },
      ]),
    ),
    ...(expect === undefined ? {} : { expect }),
    next,
  }
}

export const claimsToJudge = (scenario: Scenario) =>
  scenario.claims.map(({ measure, value, written, tolerance, lastDigit, source }) => ({
    measure,
    value: toNumber(value),
    written,
    lastDigit: toNumber(lastDigit),
    ...(tolerance === undefined ? {} : { tolerance: { kind: tolerance.kind, value: toNumber(tolerance.value) } }),
    ...(source === undefined ? {} : { source }),
  }))
