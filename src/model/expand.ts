import { StillmarkError } from '../errors/stillmark-error.js'
import { add, compare, one, subtract, toNumber, zero } from '../numbers/fraction.js'
import { copiesOf } from './copies.js'
import { exactFallback, StateFault } from './exact-fallback.js'
import { expandExactlyWith } from './expand-exactly.js'
import { type Code, emit, emitCondition, emitPosition, emitWhole, type Names, newCode } from './generated-code.js'
import { build, type Compilation, declareQuantities } from './generated-function.js'
import { inTransition } from './in-transition.js'
import type { Moves } from './model.js'

const firstRoom = 16

/** Empty buffers for `expand`; they grow as states need it. */
export function newMoves(width: number): Moves {
  return {
    count: 0,
    label: new Int32Array(firstRoom),
    rate: new Float64Array(firstRoom),
    rateError: new Float64Array(firstRoom),
    next: new Float64Array(firstRoom * width),
  }
}

function grow(moves: Moves, width: number): void {
  const room = moves.label.length * 2
  const enlarge = <T extends Int32Array | Float64Array>(old: T, length: number): T => {
    const larger = new (old.constructor as new (length: number) => T)(length)
    larger.set(old)
    return larger
  }
  moves.label = enlarge(moves.label, room)
  moves.rate = enlarge(moves.rate, room)
  moves.rateError = enlarge(moves.rateError, room)
  moves.next = enlarge(moves.next, room * width)
}

/** Probabilities may miss 1 by so much: taken as rounding and normalised. */
const rounding = 1e-9

/** The function that lists what can fire in a state, see `VariablesModel.expand`. */
export function compileExpand(compilation: Compilation): (state: ArrayLike<number>, moves: Moves) => void {
  const { scenario, body, elements } = compilation
  const width = elements.length
  const code = newCode()
  const names = declareQuantities(code, scenario, compilation.offsets)
  code.line('return (s, M) => {')
  code.line(names.forget)
  code.line('let n = 0, L = 0, total = 0, totalError = 0;')
  code.line('let label = M.label, rate = M.rate, rateError = M.rateError, next = M.next;')
  let firstLabel = 0
  body.transitions.forEach((rule, index) => {
    const copies = copiesOf(scenario, rule).length
    if (copies > 0) emitTransition(code, compilation, names, index, firstLabel)
    firstLabel += copies
  })
  code.line('M.count = n;')
  code.line('return total;')
  code.line('};')
  /** The transition that is at work, for faults that do not know theirs. */
  const cursor = { rule: 0 }
  const run = build(code, exactFallback(compilation.exact), { F: faults(compilation), G: grow, T: cursor }) as (
    state: ArrayLike<number>,
    moves: Moves,
  ) => number
  const settle = scenario.time === 'discrete' ? settleProbabilities(compilation) : undefined
  return (state, moves) => {
    try {
      const total = run(state, moves)
      if (settle !== undefined) settle(state, moves, total, width)
    } catch (fault) {
      throw fault instanceof StateFault ? inTransition(compilation, cursor.rule, undefined, state, fault) : fault
    }
  }

  function emitTransition(
    target: Code,
    { offsets, lower, upper }: Compilation,
    outer: Names,
    index: number,
    first: number,
  ): void {
    const rule = body.transitions[index]
    target.line(`T.rule = ${index}; L = ${first};`)
    let inner = outer
    for (const { name, from, to } of rule.each) {
      const own = target.fresh('b')
      const low = emitWhole(target, inner, from)
      const high = emitWhole(target, inner, to)
      target.line(`for (let ${own} = ${low}; ${own} <= ${high}; ${own}++) {`)
      inner = { ...inner, bound: new Map(inner.bound).set(name, own) }
    }
    target.line('{')
    const condition = emitCondition(target, inner, rule.when)
    target.line(`if (${condition}) {`)
    const rate = emit(target, inner, rule.rate)
    const [r, e] = [target.fresh('r'), target.fresh('e')]
    target.line(`let ${r} = ${rate.value}; const ${e} = ${rate.error};`)
    if (rate.error !== '0') {
      const bound =
        inner.bound.size === 0
          ? 'N'
          : `[${[...inner.bound].map(([name, own]) => `${target.constant(name)}, ${own}`).join(', ')}]`
      // Within its error of 0: whether it is 0 is decided in fractions, so that no move is made of a rounding.
      target.line(
        `if (!(Math.abs(${r}) > ${e}) && H.isZero(${r}, ${e}, ${target.constant(rule.rate)}, s, ${bound})) ${r} = 0;`,
      )
    }
    target.line(`if (!(${r} >= 0 && ${r} < Infinity)) F.rate(${index}, L, s, ${r});`)
    target.line(`if (${r} > 0) {`)
    if (scenario.time === 'discrete') {
      target.line(`if (${r} > 1 + 1e-9) F.over(${index}, L, s, ${r});`)
      target.line(`total += ${r};`)
    }
    target.line(
      `if (n === label.length) { G(M, ${width}); label = M.label; rate = M.rate; rateError = M.rateError; next = M.next; }`,
    )
    const at = target.fresh('a')
    target.line(`const ${at} = n * ${width};`)
    if (width <= 8) for (let i = 0; i < width; i++) target.line(`next[${at}${i === 0 ? '' : ` + ${i}`}] = s[${i}];`)
    else target.line(`for (let i = 0; i < ${width}; i++) next[${at} + i] = s[i];`)
    const writes = rule.then.map(({ variable, index: element, value }) => {
      const position = emitPosition(target, inner, { name: variable, index: element })
      const whole = target.fresh('x')
      target.line(`const ${whole} = ${emitWhole(target, inner, value)};`)
      return { position, whole, variable }
    })
    writes.forEach(({ position, whole, variable }, k) => {
      for (const earlier of writes.slice(0, k)) {
        if (earlier.variable === variable && !(/^\d+$/.test(earlier.position) && /^\d+$/.test(position))) {
          target.line(`if (${earlier.position} === ${position}) F.twice(${index}, L, s, ${position});`)
        }
      }
      const { offset } = offsets.get(variable) as { offset: number }
      const [low, high] = [lower[offset], upper[offset]]
      const outside = [
        Number.isFinite(low) ? `${whole} < ${low}` : `${whole} < -9007199254740992`,
        Number.isFinite(high) ? `${whole} > ${high}` : `${whole} > 9007199254740992`,
      ].join(' || ')
      target.line(`if (${outside}) F.bounds(${index}, L, s, ${position}, ${whole});`)
      target.line(`next[${at} + ${position}] = ${whole};`)
    })
    target.line(`label[n] = L; rate[n] = ${r}; rateError[n] = ${e}; n++;`)
    target.line('}')
    target.line('}')
    target.line('}')
    target.line('L++;')
    for (const _ of rule.each) target.line('}')
  }

  function faults({ elements: names, lower, upper }: Compilation) {
    const tell = (
      index: number,
      label: number,
      state: ArrayLike<number>,
      code_: string,
      what: string,
      next: string,
    ): never => {
      throw inTransition(compilation, index, label, state, new StateFault(code_, what, next))
    }
    return {
      rate: (index: number, label: number, state: ArrayLike<number>, value: number) =>
        value < 0
          ? tell(
              index,
              label,
              state,
              'negative-rate',
              `the ${kindOf(scenario.time)} is ${value}, which is negative.`,
              'Guard it with "when", or use max(0, …).',
            )
          : tell(
              index,
              label,
              state,
              'not-finite',
              `the ${kindOf(scenario.time)} is ${value}.`,
              'Look for a division by 0 or numbers beyond 1e308.',
            ),
      over: (index: number, label: number, state: ArrayLike<number>, value: number) =>
        tell(
          index,
          label,
          state,
          'probability-over-1',
          `the probability is ${value}, over 1.`,
          'A probability is at most 1.',
        ),
      bounds: (index: number, label: number, state: ArrayLike<number>, position: number, value: number) => {
        const [low, high] = [lower[position], upper[position]]
        const name = names[position]
        if (!Number.isFinite(value) || (!Number.isFinite(low) && !Number.isFinite(high))) {
          return tell(
            index,
            label,
            state,
            'too-large',
            `"${name}" becomes ${value}, beyond what can be kept exactly.`,
            'Measure it in larger units.',
          )
        }
        return tell(
          index,
          label,
          state,
          'outside-bounds',
          `"${name}" becomes ${value}, outside its bounds ${Number.isFinite(low) ? low : 'without lower end'} to ${Number.isFinite(high) ? high : 'without upper end'}.`,
          'Guard the transition with "when", or widen the bounds.',
        )
      },
      twice: (index: number, label: number, state: ArrayLike<number>, position: number) =>
        tell(
          index,
          label,
          state,
          'written-twice',
          `"${names[position]}" is written twice.`,
          'Let each firing write an element once.',
        ),
    }
  }

  function settleProbabilities(all: Compilation) {
    const exactly = expandExactlyWith(all)
    const stays = body.remainder === 'stay'
    return (state: ArrayLike<number>, moves: Moves, total: number, own: number): void => {
      let error = 0
      for (let k = 0; k < moves.count; k++) error += moves.rateError[k]
      error += moves.count * total * 2 ** -52
      const rest = 1 - total
      if (stays) {
        settleStay(state, moves, rest, error, own)
        return
      }
      if (!(Math.abs(rest) <= rounding + error)) throw sumFault(state, total)
      // Within rounding of 1: what is written sums to 1 exactly, or is a rounded 1 that is brought to it.
      if (Math.abs(rest) <= error || moves.count === 0) {
        if (moves.count === 0) throw sumFault(state, 0)
        if (error < 1e-12) return
      }
      const exact = exactSum(state)
      if (exact !== undefined && compare(exact, one) === 0) return
      const divisor = exact === undefined ? total : toNumber(exact)
      if (!(Math.abs(1 - divisor) <= rounding)) throw sumFault(state, divisor)
      for (let k = 0; k < moves.count; k++) {
        moves.rate[k] /= divisor
        moves.rateError[k] =
          moves.rateError[k] / divisor + moves.rate[k] * (2 ** -52 + (exact === undefined ? error : 0))
      }
    }

    function settleStay(state: ArrayLike<number>, moves: Moves, rest: number, error: number, own: number): void {
      let left = rest
      let leftError = error + 2 ** -53
      if (Math.abs(rest) <= error + rounding) {
        const exact = exactSum(state)
        if (exact !== undefined) {
          left = toNumber(subtract(one, exact))
          leftError = Math.abs(left) * 2 ** -53
        } else if (rest < 0) left = 0
      }
      if (left < -rounding) throw sumFault(state, 1 - left)
      if (left <= 0) return
      if (moves.count === moves.label.length) grow(moves, own)
      const at = moves.count * own
      for (let i = 0; i < own; i++) moves.next[at + i] = state[i]
      moves.label[moves.count] = -1
      moves.rate[moves.count] = left
      moves.rateError[moves.count++] = leftError
    }

    function exactSum(state: ArrayLike<number>) {
      let sum = zero
      for (const { rate, label } of exactly(state)) {
        if (rate === undefined) return undefined
        if (label >= 0) sum = add(sum, rate)
      }
      return sum
    }

    function sumFault(state: ArrayLike<number>, total: number): StillmarkError {
      return new StillmarkError({
        code: 'probabilities-off',
        where: { file: scenario.source.file, key: 'transitions' },
        what: `In the state ${all.describe(state)} the probabilities sum to ${Number(total.toPrecision(12))}, not to 1.`,
        next: stays
          ? 'They may sum to at most 1.'
          : 'Correct them, or write "remainder: stay" at the top level where the rest stays.',
      })
    }
  }
}

const kindOf = (time: string): string => (time === 'continuous' ? 'rate' : 'probability')
