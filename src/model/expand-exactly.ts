import { type Fraction, isInteger, sign } from '../numbers/fraction.js'
import { NoValue } from '../scenario/evaluate-exactly.js'
import { copiesOf } from './copies.js'
import { StateFault } from './exact-fallback.js'
import type { Compilation } from './generated-function.js'
import { inTransition } from './in-transition.js'
import type { ExactMove } from './model.js'

/** The moves of a state in exact fractions, by walking the checked trees: slow, sharing nothing with generated code. */
export function expandExactlyWith(compilation: Compilation): (state: ArrayLike<number>) => readonly ExactMove[] {
  const { scenario, body, offsets, exact } = compilation
  const copies = body.transitions.map((rule) => copiesOf(scenario, rule))
  return (state) => {
    const moves: ExactMove[] = []
    let label = -1
    body.transitions.forEach((rule, index) => {
      for (const copy of copies[index]) {
        label++
        const bound = copy.flatMap((value, i): (string | number)[] => [rule.each[i].name, value])
        try {
          const holds = exact(rule.when, state, bound)
          if (holds !== undefined && sign(holds) === 0) continue
          const rate: Fraction | undefined = exact(rule.rate, state, bound)
          if (rate !== undefined && sign(rate) === 0) continue
          const next = Array.from(state)
          for (const { variable, index: element, value } of rule.then) {
            const { offset, declared } = offsets.get(variable) as {
              offset: number
              declared: { index?: { from: number; to: number } }
            }
            const at = element === undefined ? undefined : exact(element, state, bound)
            const written = exact(value, state, bound)
            if (written === undefined || !isInteger(written)) {
              throw new StateFault('not-whole', `"${variable}" becomes no whole number.`, 'Use floor or ceil.')
            }
            next[offset + (at === undefined ? 0 : Number(at.numerator) - (declared.index?.from ?? 0))] = Number(
              written.numerator,
            )
          }
          moves.push({ label, rate, next })
        } catch (error) {
          if (error instanceof NoValue)
            throw inTransition(compilation, index, label, state, new StateFault('no-value', error.message, error.next))
          throw error instanceof StateFault ? inTransition(compilation, index, label, state, error) : error
        }
      }
    })
    return moves
  }
}
