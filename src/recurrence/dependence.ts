import type { VariablesModel } from '../model/model.js'
import type { Fraction } from '../numbers/fraction.js'
import { bodyOf, type Expression, elementOf, type Reading } from './reading.js'

/**
 * Elements of the state that occur in an expression: it can't depend on any other. An index that depends on the state
 * makes the whole array occur.
 */
export function occurring(
  model: VariablesModel,
  expression: Expression,
  bound: ReadonlyMap<string, Fraction>,
): Set<number> {
  const found = new Set<number>()
  const reading: Reading = {
    model,
    symbols: 0,
    elements: [],
    bound,
    modulus: 1n,
    residue: 0n,
    reach: { level: 0, approximate: false },
  }
  const visit = (node: Expression, inner: ReadonlyMap<string, Fraction> | undefined): void => {
    switch (node.kind) {
      case 'variable': {
        if (node.index !== undefined) visit(node.index, inner)
        for (const element of elementsNamed(
          model,
          node,
          inner === undefined ? undefined : { ...reading, bound: inner },
        )) {
          found.add(element)
        }
        return
      }
      case 'constant':
        if (node.index !== undefined) visit(node.index, inner)
        return
      case 'quantity': {
        const quantity = model.scenario.quantities.get(node.name)
        if (quantity !== undefined) visit(quantity, new Map())
        return
      }
      case 'negate':
      case 'not':
        visit(node.of, inner)
        return
      case 'arithmetic':
      case 'compare':
      case 'logic':
        visit(node.left, inner)
        visit(node.right, inner)
        return
      case 'if':
        visit(node.condition, inner)
        visit(node.yes, inner)
        visit(node.no, inner)
        return
      case 'call':
        for (const each of node.args) visit(each, inner)
        return
      case 'fold':
        visit(node.from, inner)
        visit(node.to, inner)
        visit(node.of, undefined) // its index takes many values: whole arrays
        return
      default:
    }
  }
  visit(expression, bound)
  return found
}

/** The element that is named, or all of its array where the index is not a constant. */
function elementsNamed(
  model: VariablesModel,
  node: { readonly name: string; readonly index?: Expression },
  reading: Reading | undefined,
): number[] {
  let position = 0
  for (const variable of bodyOf(model).variables) {
    const count = variable.index === undefined ? 1 : variable.index.to - variable.index.from + 1
    if (variable.name === node.name) {
      if (reading !== undefined) {
        try {
          return [elementOf(node, reading)]
        } catch {
          // The index depends on the state: any element may be meant.
        }
      }
      return Array.from({ length: count }, (_, k) => position + k)
    }
    position += count
  }
  return []
}
