import type { Expression } from './expression.js'

/** The parts of an expression, itself not among them. */
export function partsOf(expression: Expression): readonly Expression[] {
  switch (expression.kind) {
    case 'number':
    case 'truth':
    case 'quantity':
    case 'bound':
      return []
    case 'constant':
    case 'variable':
      return expression.index === undefined ? [] : [expression.index]
    case 'transition':
      return expression.copy ?? []
    case 'negate':
    case 'not':
      return [expression.of]
    case 'arithmetic':
    case 'compare':
    case 'logic':
      return [expression.left, expression.right]
    case 'if':
      return [expression.condition, expression.yes, expression.no]
    case 'call':
      return expression.args
    case 'fold':
      return [expression.from, expression.to, expression.of]
  }
}

export const mentionsTransition = (expression: Expression): boolean =>
  expression.kind === 'transition' || partsOf(expression).some(mentionsTransition)

const mentionsState = (expression: Expression): boolean =>
  expression.kind === 'variable' || expression.kind === 'quantity' || partsOf(expression).some(mentionsState)

const isConstant = (expression: Expression): boolean => !mentionsTransition(expression) && !mentionsState(expression)

/**
 * Whether an expression over transitions is a sum of frequencies times constants, without anything added: then it is a
 * frequency itself, of weighted firings.
 */
export function isLinearInFirings(expression: Expression): boolean {
  switch (expression.kind) {
    case 'transition':
      return (expression.copy ?? []).every(isConstant)
    case 'negate':
      return isLinearInFirings(expression.of)
    case 'arithmetic': {
      const { op, left, right } = expression
      if (op === '+' || op === '-') return isLinearInFirings(left) && isLinearInFirings(right)
      if (op === '*')
        return (isLinearInFirings(left) && isConstant(right)) || (isConstant(left) && isLinearInFirings(right))
      return op === '/' && isLinearInFirings(left) && isConstant(right)
    }
    case 'fold':
      return (
        expression.fold === 'sum' &&
        isConstant(expression.from) &&
        isConstant(expression.to) &&
        isLinearInFirings(expression.of)
      )
    default:
      return false
  }
}
