import { StillmarkError } from '../errors/stillmark-error.js'
import { type Fraction, fraction } from '../numbers/fraction.js'
import { evaluateExactly, NoValue } from '../scenario/evaluate-exactly.js'
import type { Expression } from '../scenario/expression.js'
import type { Scenario, TransitionRule } from '../scenario/scenario.js'

/** Copies of one transition at most. */
const mostCopies = 1_000_000

/**
 * The values of its indices for every copy of a transition, the last index running fastest; one empty list for a
 * transition without `each`, none where a range is empty.
 *
 * @throws StillmarkError too-many-copies (limit), not-whole, no-value
 */
export function copiesOf(scenario: Scenario, rule: TransitionRule): readonly (readonly number[])[] {
  let copies: (readonly number[])[] = [[]]
  rule.each.forEach(({ name, from, to }, level) => {
    const next: (readonly number[])[] = []
    for (const copy of copies) {
      const bound = new Map(copy.map((value, i): [string, Fraction] => [rule.each[i].name, fraction(value)]))
      const first = wholeEnd(scenario, rule, name, from, bound)
      const last = wholeEnd(scenario, rule, name, to, bound)
      if (last - first + next.length > mostCopies) throw tooMany(scenario, rule)
      for (let value = first; value <= last; value++) next.push([...copy, value])
    }
    copies = next
    if (level > 20) throw tooMany(scenario, rule)
  })
  return copies
}

function wholeEnd(
  scenario: Scenario,
  rule: TransitionRule,
  name: string,
  end: Expression,
  bound: ReadonlyMap<string, Fraction>,
): number {
  const where = {
    file: scenario.source.file,
    line: rule.at.line,
    column: rule.at.column,
    key: `transitions.${rule.name}.each.${name}`,
  }
  try {
    const value = evaluateExactly(end, {
      constants: scenario.constants,
      quantities: new Map(),
      variable: () => undefined,
      bound,
    })
    if (value !== undefined && value.denominator === 1n) return Number(value.numerator)
  } catch (error) {
    if (!(error instanceof NoValue)) throw error
    throw new StillmarkError({ code: 'no-value', where, what: error.message, next: error.next })
  }
  throw new StillmarkError({
    code: 'not-whole',
    where,
    what: `"${name}" does not go from a whole number to a whole number.`,
    next: 'Use floor or ceil.',
  })
}

const tooMany = (scenario: Scenario, rule: TransitionRule): StillmarkError =>
  new StillmarkError(
    {
      code: 'too-many-copies',
      where: {
        file: scenario.source.file,
        line: rule.at.line,
        column: rule.at.column,
        key: `transitions.${rule.name}.each`,
      },
      what: `"each" makes more than ${mostCopies.toLocaleString('en-US')} copies of the transition "${rule.name}".`,
      next: 'Make its ranges shorter.',
    },
    'limit',
  )
