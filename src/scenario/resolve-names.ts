import type { Fraction } from '../numbers/fraction.js'
import type { Expression, Spot } from './expression.js'
import type { Syntax } from './expression-syntax.js'
import { folds, functions, isFold, isFunction, nameFault, nearest, suggestion } from './names.js'

/** What a name may stand for in a scenario. */
export interface Scope {
  readonly constants: ReadonlyMap<string, Fraction | readonly Fraction[]>
  readonly quantities: ReadonlySet<string>
  readonly variables: ReadonlyMap<string, { readonly index?: { readonly from: number; readonly to: number } }>
  /** Names of the transitions with the number of their `each` indices. */
  readonly transitions: ReadonlyMap<string, number>
}

/** Which of them an expression may use. */
export interface Allowed {
  /** State variables and quantities. */
  readonly state: boolean
  readonly transitions: boolean
  /** Names bound by `each`. */
  readonly bound: ReadonlySet<string>
}

export type Report = (code: string, at: Spot, what: string, next: string, text: string) => void

/** An expression in place of one that is faulty: nothing is concluded from it, the fault has been reported. */
const faulty: Expression = { kind: 'number', value: { numerator: 0n, denominator: 1n } }

/** Looks every name up and checks calls, indices and folds. Reports all that is wrong, once a place. */
export function resolveNames(
  syntax: Syntax,
  scope: Scope,
  allowed: Allowed,
  spotAt: (offset: number) => Spot,
  report: Report,
): Expression {
  const wrong = (code: string, node: Syntax, what: string, next: string, text: string): Expression => {
    report(code, spotAt(node.at), what, next, text)
    return faulty
  }
  const resolve = (node: Syntax, bound: ReadonlySet<string>): Expression => {
    const at = spotAt(node.at)
    switch (node.kind) {
      case 'number':
      case 'truth':
        return { ...node, at }
      case 'negate':
      case 'not':
        return { kind: node.kind, of: resolve(node.of, bound), at }
      case 'arithmetic':
        return {
          kind: 'arithmetic',
          op: node.op,
          left: resolve(node.left, bound),
          right: resolve(node.right, bound),
          at,
        }
      case 'compare':
        return { kind: 'compare', op: node.op, left: resolve(node.left, bound), right: resolve(node.right, bound), at }
      case 'logic':
        return { kind: 'logic', op: node.op, left: resolve(node.left, bound), right: resolve(node.right, bound), at }
      case 'call':
        return resolveCall(node, bound, at)
      case 'name':
        return resolveName(node, bound, at)
    }
  }
  const resolveCall = (node: Extract<Syntax, { kind: 'call' }>, bound: ReadonlySet<string>, at: Spot): Expression => {
    const { name, args } = node
    if (name === 'if') {
      if (args.length !== 3) {
        return wrong(
          'argument-count',
          node,
          `"if" takes 3 arguments, here are ${args.length}.`,
          'Write if(condition, a, b).',
          name,
        )
      }
      const [condition, yes, no] = args.map((each) => resolve(each, bound))
      return { kind: 'if', condition, yes, no, at }
    }
    if (isFold(name)) {
      if (args.length !== 4) {
        return wrong(
          'argument-count',
          node,
          `"${name}" takes 4 arguments, here are ${args.length}.`,
          `Write ${name}(i, 1, 3, waiting[i]).`,
          name,
        )
      }
      const [index, from, to, of] = args
      if (index.kind !== 'name' || index.index !== undefined) {
        return wrong(
          'fold-index',
          index,
          `The first argument of "${name}" is the name of its index.`,
          `Write ${name}(i, 1, 3, waiting[i]).`,
          name,
        )
      }
      const fault = nameFault(index.name)
      if (fault !== undefined) return wrong('bad-name', index, fault.what, fault.next, index.name)
      if (isKnown(index.name, bound)) {
        return wrong(
          'name-hidden',
          index,
          `"${index.name}" is a name already, and an index may not hide it.`,
          'Choose another name for the index.',
          index.name,
        )
      }
      return {
        kind: 'fold', fold: name, bound: index.name, from: resolve(from, bound), to: resolve(to, bound),
        of: resolve(of, new Set([...bound, index.name])), at,
      } // biome-ignore format: one line a thing
    }
    if (!isFunction(name)) {
      if (isKnown(name, bound)) {
        return wrong(
          'not-a-function',
          node,
          `"${name}" is not a function.`,
          'Write * to multiply, and [ ] for an index.',
          name,
        )
      }
      return wrong(
        'unknown-function',
        node,
        `"${name}" is not a function.`,
        suggestion(name, [...Object.keys(functions), 'if', ...folds]),
        name,
      )
    }
    const [least, most] = functions[name]
    if (args.length < least || args.length > most) {
      const takes = least === most ? `${least} ${least === 1 ? 'argument' : 'arguments'}` : `${least} or more arguments`
      return wrong(
        'argument-count',
        node,
        `"${name}" takes ${takes}, here ${args.length === 1 ? 'is 1' : `are ${args.length}`}.`,
        'Check its commas and brackets.',
        name,
      )
    }
    return { kind: 'call', name, args: args.map((each) => resolve(each, bound)), at }
  }
  const isKnown = (name: string, bound: ReadonlySet<string>): boolean =>
    bound.has(name) ||
    scope.constants.has(name) ||
    scope.quantities.has(name) ||
    scope.variables.has(name) ||
    scope.transitions.has(name)
  const resolveName = (node: Extract<Syntax, { kind: 'name' }>, bound: ReadonlySet<string>, at: Spot): Expression => {
    const { name, index } = node
    const indices = index?.map((each) => resolve(each, bound))
    const single = (what: string): Expression | undefined => {
      if (indices === undefined || indices.length === 1) return indices?.[0]
      wrong(
        'index-count',
        node,
        `${what} "${name}" takes one index, here are ${indices.length}.`,
        `Write ${name}[1].`,
        name,
      )
      return undefined
    }
    const noIndex = (what: string): Expression | undefined =>
      indices === undefined
        ? undefined
        : wrong('no-index', node, `${what} "${name}" has no index.`, `Write ${name}.`, name)
    if (bound.has(name)) return noIndex('The index') ?? { kind: 'bound', name, at }
    const constant = scope.constants.get(name)
    if (constant !== undefined) {
      if (!Array.isArray(constant)) return noIndex('The constant') ?? { kind: 'constant', name, at }
      if (indices === undefined) {
        return wrong(
          'index-missing',
          node,
          `The constant "${name}" is a list.`,
          `Write ${name}[1] to ${name}[${constant.length}].`,
          name,
        )
      }
      return (
        inside(node, single('The constant'), 1, constant.length) ?? {
          kind: 'constant',
          name,
          index: single('The constant'),
          at,
        }
      )
    }
    const variable = scope.variables.get(name)
    if (variable !== undefined && allowed.state) {
      const range = variable.index
      if (range === undefined) return noIndex('The variable') ?? { kind: 'variable', name, at }
      if (indices === undefined) {
        return wrong(
          'index-missing',
          node,
          `The variable "${name}" is an array.`,
          `Write ${name}[${range.from}] to ${name}[${range.to}], or sum(i, ${range.from}, ${range.to}, ${name}[i]).`,
          name,
        )
      }
      return (
        inside(node, single('The variable'), range.from, range.to) ?? {
          kind: 'variable',
          name,
          index: single('The variable'),
          at,
        }
      )
    }
    if (scope.quantities.has(name) && allowed.state) return noIndex('The quantity') ?? { kind: 'quantity', name, at }
    const dimensions = scope.transitions.get(name)
    if (dimensions !== undefined && allowed.transitions) {
      if (indices !== undefined && indices.length !== dimensions) {
        return wrong(
          'index-count',
          node,
          `The transition "${name}" has ${dimensions} ${dimensions === 1 ? 'index' : 'indices'}, here are ${indices.length}.`,
          `Write ${name} for all its copies together.`,
          name,
        )
      }
      return { kind: 'transition', name, ...(indices === undefined ? {} : { copy: indices }), at }
    }
    if (dimensions !== undefined) {
      return wrong(
        'transition-here',
        node,
        `"${name}" is a transition, which has no value here.`,
        'A transition stands for its frequency, in "frequency" and "ratio" only.',
        name,
      )
    }
    if (variable !== undefined || scope.quantities.has(name)) {
      return wrong(
        'state-here',
        node,
        `"${name}" depends on the state, which this may not.`,
        'Only constants can be used here.',
        name,
      )
    }
    const candidates = [
      ...bound,
      ...scope.constants.keys(),
      ...(allowed.state ? [...scope.variables.keys(), ...scope.quantities] : []),
      ...(allowed.transitions ? scope.transitions.keys() : []),
    ]
    const kinds = `${allowed.state ? 'a constant, quantity or state variable' : 'a constant'}${allowed.transitions ? ' or a transition' : ''}`
    const near = nearest(name, candidates)
    return wrong(
      'unknown-name',
      node,
      `"${name}" is not ${kinds}.`,
      near === undefined ? suggestion(name, candidates) : `Did you mean "${near}"?`,
      name,
    )
  }
  /** An index that is a plain number is checked at once; others when they are met. */
  const inside = (node: Syntax, index: Expression | undefined, from: number, to: number): Expression | undefined => {
    if (index?.kind !== 'number') return undefined
    const { numerator, denominator } = index.value
    if (denominator === 1n && numerator >= BigInt(from) && numerator <= BigInt(to)) return undefined
    const name = node.kind === 'name' ? node.name : ''
    return wrong(
      'index-outside',
      node,
      `"${name}" has no element ${numerator}${denominator === 1n ? '' : `/${denominator}`}.`,
      `Its elements are ${from} to ${to}.`,
      name,
    )
  }
  return resolve(syntax, allowed.bound)
}
