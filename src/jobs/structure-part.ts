import type { Chain, Structure } from '../chain/chain.js'
import { shownState } from '../chain/shown-state.js'
import { toText } from '../numbers/fraction.js'
import type { Classification } from '../recurrence/classification.js'
import type { StructurePart } from './document.js'

/** States of a class that are listed by name or value. */
const listedStates = 100

/**
 * A finite chain as the document shows it. Every closed class of a finite chain is positive recurrent, and the chain
 * enters one of them with certainty (Feller 1968, XV.6 and XV.8, from memory): finiteness, which the enumeration
 * has shown, is the theorem's only hypothesis.
 */
export function finiteStructurePart(chain: Chain, structure: Structure): StructurePart {
  return {
    states: chain.size,
    transitions: structure.transitions,
    recurrence: 'positive recurrent',
    grade: 'proved',
    basis: finiteBasis(chain, structure),
    closedClasses: structure.closedClasses.map((each) => ({
      size: each.states.length,
      period: each.period,
      reachedWith: each.reachedWith,
      states: Array.from(each.states.subarray(0, listedStates), (state) => shownState(chain, state)),
    })),
    transientStates: structure.transientStates.length,
    meanTimeToSettle: structure.meanTimeToSettle,
  }
}

/** An unbounded model as the document shows it, with what its classification rests on. */
export function countableStructurePart(countable: Classification): StructurePart {
  const { recurrence, grade, basis, checked, explosive, closedClasses, drift, growth } = countable
  return {
    states: null,
    transitions: null,
    recurrence,
    grade,
    basis,
    ...(checked.length === 0 ? {} : { checked }),
    closedClasses: closedClasses.map(({ size, period }) => ({
      size,
      period,
      reachedWith: closedClasses.length === 1 && recurrence !== 'mixed' ? 1 : null,
    })),
    transientStates: null,
    meanTimeToSettle: null,
    ...(explosive === undefined ? {} : { explosive }),
    ...(drift === undefined
      ? {}
      : {
          drift: drift.map(({ of, where, value, exact }) => ({
            of,
            where,
            value,
            ...(exact === undefined ? {} : { exact: toText(exact) }),
          })),
        }),
    ...(growth === undefined
      ? {}
      : { growth: growth.map(({ name, value, means, source }) => ({ name, value, means, source })) }),
  }
}

/** "25 states, one closed class, aperiodic: a finite closed class is positive recurrent (Feller 1968, XV.6)". */
function finiteBasis(chain: Chain, structure: Structure): string {
  const { closedClasses, transientStates } = structure
  const states = `${chain.size.toLocaleString('en-US')} ${chain.size === 1 ? 'state' : 'states'}`
  const classes = closedClasses.length === 1 ? 'one closed class' : `${closedClasses.length} closed classes`
  const transient = transientStates.length === 0 ? '' : `, ${transientStates.length.toLocaleString('en-US')} transient`
  const periods = [...new Set(closedClasses.map((each) => each.period))].sort((a, b) => a - b)
  const period =
    chain.time === 'continuous'
      ? ''
      : periods.length === 1 && periods[0] === 1
        ? ', aperiodic'
        : `, ${periods.length === 1 ? 'period' : 'periods'} ${periods.join(' and ')}`
  return `${states}, ${classes}${period}${transient}: a finite closed class is positive recurrent (Feller 1968, XV.6)`
}
