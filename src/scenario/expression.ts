import type { Fraction } from '../numbers/fraction.js'

/** Where an expression's text stands in its file, line and column from 1. */
export interface Spot {
  readonly line: number
  readonly column: number
}

/**
 * A checked expression: every name is resolved, every node is on this list, nothing else can be run.
 * A condition used as a number is 1 or 0; a number used as a condition holds where it is not 0.
 */
export type Expression = { readonly at?: Spot } & (
  | { readonly kind: 'number'; readonly value: Fraction }
  | { readonly kind: 'truth'; readonly value: boolean }
  /** A constant; `index` where it is a list (counted from 1). */
  | { readonly kind: 'constant'; readonly name: string; readonly index?: Expression }
  /** A state variable; `index` where it is an array (counted from its index's `from`). */
  | { readonly kind: 'variable'; readonly name: string; readonly index?: Expression }
  | { readonly kind: 'quantity'; readonly name: string }
  /** A name bound by `each` or by a fold. */
  | { readonly kind: 'bound'; readonly name: string }
  /** A transition's frequency; only in `frequency` and the sides of a `ratio`. `copy` picks one of its copies. */
  | { readonly kind: 'transition'; readonly name: string; readonly copy?: readonly Expression[] }
  | { readonly kind: 'negate'; readonly of: Expression }
  | { readonly kind: 'not'; readonly of: Expression }
  | {
      readonly kind: 'arithmetic'
      readonly op: ArithmeticOperator
      readonly left: Expression
      readonly right: Expression
    }
  | { readonly kind: 'compare'; readonly op: Comparison; readonly left: Expression; readonly right: Expression }
  | { readonly kind: 'logic'; readonly op: 'and' | 'or'; readonly left: Expression; readonly right: Expression }
  | { readonly kind: 'if'; readonly condition: Expression; readonly yes: Expression; readonly no: Expression }
  | { readonly kind: 'call'; readonly name: FunctionName; readonly args: readonly Expression[] }
  | {
      readonly kind: 'fold'
      readonly fold: 'sum' | 'max_of' | 'min_of'
      readonly bound: string
      readonly from: Expression
      readonly to: Expression
      readonly of: Expression
    }
)

/** `^` groups to the right and binds tighter than the sign before it; `%` is the remainder with the divisor's sign. */
export type ArithmeticOperator = '+' | '-' | '*' | '/' | '^' | '%'
export type Comparison = '<' | '<=' | '>' | '>=' | '==' | '!='
export type FunctionName =
  | 'min'
  | 'max'
  | 'floor'
  | 'ceil'
  | 'abs'
  | 'exp'
  | 'log'
  | 'sqrt'
  | 'poisson'
  | 'binomial'
  | 'geometric'
  | 'poisson_tail'
  | 'binomial_tail'
  | 'geometric_tail'
