import { Matrix, solve } from 'ml-matrix'
import seedrandom from 'seedrandom'
import { expect, test } from 'vitest'
import { classifyCountable } from '../../src/recurrence/classify.js'
import { modelOf } from './model-of.js'

const plain = { withoutRemedies: true }

interface Arc {
  readonly from: number
  readonly to: number
  readonly jump: number
  readonly rate: number
}

/** A model with phases whose count starts at 0; a jump that would fall below 0 stops there. */
const modelOfArcs = (phases: number, arcs: readonly Arc[]) =>
  modelOf(
    [
      `state: { n: { from: 0, start: 0 }, phase: { from: 0, to: ${Math.max(phases - 1, 1)}, start: 0 } }`,
      'transitions:',
      ...arcs.map(
        ({ from, to, jump, rate }, k) =>
          `  t${k}: { when: "phase == ${from}", rate: ${rate}, then: { n: "max(n + ${jump}, 0)", phase: ${to} } }`,
      ),
    ].join('\n'),
  )

/** Stationary shares of the phases by one linear system, in doubles. */
function sharesOf(phases: number, arcs: readonly Arc[]): number[] {
  const system = Matrix.zeros(phases, phases)
  for (const { from, to, rate } of arcs) {
    system.set(to, from, system.get(to, from) + rate)
    system.set(from, from, system.get(from, from) - rate)
  }
  for (let k = 0; k < phases; k++) system.set(0, k, 1)
  const right = Matrix.zeros(phases, 1)
  right.set(0, 0, 1)
  return solve(system, right).getColumn(0)
}

/** Which phases each can reach, by repeated relaxation. */
function reachable(phases: number, arcs: readonly Arc[]): boolean[][] {
  const way = Array.from({ length: phases }, (_, i) => Array.from({ length: phases }, (_, j) => i === j))
  for (const { from, to } of arcs) way[from][to] = true
  for (let k = 0; k < phases; k++) {
    for (let i = 0; i < phases; i++) for (let j = 0; j < phases; j++) way[i][j] ||= way[i][k] && way[k][j]
  }
  return way
}

/** Sign of the mean drift of a closed set of phases; undefined where doubles can't tell. */
function driftSign(members: readonly number[], arcs: readonly Arc[]): number | undefined {
  const own = arcs
    .filter(({ from }) => members.includes(from))
    .map((arc) => ({ ...arc, from: members.indexOf(arc.from), to: members.indexOf(arc.to) }))
  const shares = sharesOf(members.length, own)
  const drift = own.reduce((sum, { from, jump, rate }) => sum + shares[from] * rate * jump, 0)
  return Math.abs(drift) < 1e-9 ? 0 : Math.sign(drift)
}

// A drift of 0 is a rational number whose denominator is far below 1e9 here (rates up to 6, at most 4 phases), so
// 1e-9 tells 0 from anything else. From 0 every phase that is reachable is reached, since no arc is ever blocked.
test('500 random models with one unbounded variable: no class is proved wrongly, and all are proved', () => {
  const random = seedrandom('homogeneous-ends')
  const below = (n: number): number => Math.floor(random() * n)
  const tally = new Map<string, number>()
  for (let round = 0; round < 500; round++) {
    const phases = 1 + below(4)
    const arcs: Arc[] = []
    const count = phases + 2 + below(5)
    for (let k = 0; k < count; k++) {
      arcs.push({ from: below(phases), to: below(phases), jump: below(7) - 3, rate: 1 + below(6) })
    }
    // Half of the models are one ring, so that all phases communicate.
    if (round % 2 === 0)
      for (let k = 0; k < phases; k++) arcs.push({ from: k, to: (k + 1) % phases, jump: 0, rate: 1 + below(3) })
    // Each phase gets a way up and a way down, so that no set of phases stands still.
    for (let k = 0; k < phases; k++) {
      arcs.push({ from: k, to: k, jump: 1, rate: 1 + below(3) }, { from: k, to: k, jump: -1, rate: 1 + below(3) })
    }
    if (round % 3 === 0) balance(phases, arcs)
    const way = reachable(phases, arcs)
    const met = [...way[0].keys()].filter((k) => way[0][k])
    const closed = met.filter((k) => met.every((j) => !way[k][j] || way[j][k]))
    const classes = [...new Set(closed.map((k) => met.filter((j) => way[k][j] && way[j][k]).join(' ')))]
    const signs = classes.map((members) => driftSign(members.split(' ').map(Number), arcs))
    const expected = signs.every((each) => each === -1)
      ? 'positive recurrent'
      : signs.every((each) => each === 0)
        ? 'null recurrent'
        : signs.every((each) => each === 1)
          ? 'transient'
          : signs.includes(-1)
            ? 'mixed'
            : 'undetermined'
    const { recurrence, grade } = classifyCountable(modelOfArcs(phases, arcs), plain)
    tally.set(expected, (tally.get(expected) ?? 0) + 1)
    expect([round, recurrence, grade]).toEqual([round, expected, expected === 'undetermined' ? 'open' : 'proved'])
  }
  // All kinds occurred, or the test says little.
  expect([...tally.keys()].sort()).toEqual(
    ['mixed', 'null recurrent', 'positive recurrent', 'transient', 'undetermined'].filter((each) => tally.has(each)),
  )
  expect(tally.get('null recurrent')).toBeGreaterThan(40)
  expect(tally.get('transient')).toBeGreaterThan(80)
  expect(tally.get('positive recurrent')).toBeGreaterThan(80)
  expect(tally.get('mixed')).toBeGreaterThan(0)
}, 60_000)

/** Adds to every phase what makes its own drift 0, so that all mean drifts are exactly 0. */
function balance(phases: number, arcs: Arc[]): void {
  for (let k = 0; k < phases; k++) {
    const drift = arcs.filter(({ from }) => from === k).reduce((sum, { jump, rate }) => sum + jump * rate, 0)
    if (drift !== 0) arcs.push({ from: k, to: k, jump: -Math.sign(drift), rate: Math.abs(drift) })
  }
}

/** Stationary mean of the first coordinate's drift along its axis: the second coordinate's own chain, cut off far out. */
function axisDrift(inside: readonly (readonly number[])[], along: readonly (readonly number[])[], axis: 0 | 1): number {
  const other = 1 - axis
  const size = 400
  const total = (moves: readonly (readonly number[])[], jump: number): number =>
    moves.reduce((sum, move) => sum + (move[other] === jump ? move[2] : 0), 0)
  // Nearest-neighbour chain of the other coordinate: detailed balance, summed in plain numbers.
  const weights = [1]
  for (let y = 1; y < size; y++) {
    const up = total(y === 1 ? along : inside, 1)
    weights.push((weights[y - 1] * up) / total(inside, -1))
  }
  const sum = weights.reduce((a, b) => a + b, 0)
  const drift = (moves: readonly (readonly number[])[]): number =>
    moves.reduce((all, move) => all + move[axis] * move[2], 0)
  return (weights[0] / sum) * drift(along) + (1 - weights[0] / sum) * drift(inside)
}

// The independent side cuts the chain off at 400, where for the drifts chosen (|ratio| at most 5/6) weights are below 1e-31.
test('200 random walks in the quarter plane: no class is proved wrongly', () => {
  const random = seedrandom('quarter-planes')
  const below = (n: number): number => Math.floor(random() * n)
  const neighbours = [-1, 0, 1]
    .flatMap((dx) => [-1, 0, 1].map((dy) => [dx, dy] as const))
    .filter(([dx, dy]) => dx !== 0 || dy !== 0)
  const moves = (allowed: (dx: number, dy: number) => boolean): number[][] =>
    neighbours.filter(([dx, dy]) => allowed(dx, dy)).map(([dx, dy]) => [dx, dy, Math.max(1, below(6))])
  const tally = new Map<string, number>()
  for (let round = 0; round < 200; round++) {
    const inside = moves(() => true)
    const first = moves((_, dy) => dy >= 0)
    const second = moves((dx) => dx >= 0)
    const corner = moves((dx, dy) => dx >= 0 && dy >= 0)
    const region = (condition: string, own: readonly (readonly number[])[], name: string): string[] =>
      own.map(
        ([dx, dy, rate], k) =>
          `  ${name}${k}: { when: "${condition}", rate: ${rate}, then: { x: x + ${dx}, y: y + ${dy} } }`,
      )
    const model = modelOf(
      [
        'state: { x: { from: 0, start: 0 }, y: { from: 0, start: 0 } }',
        'transitions:',
        ...region('x > 0 and y > 0', inside, 'a'),
        ...region('x > 0 and y == 0', first, 'b'),
        ...region('x == 0 and y > 0', second, 'c'),
        ...region('x == 0 and y == 0', corner, 'd'),
      ].join('\n'),
    )
    const mean = (axis: 0 | 1): number => inside.reduce((sum, move) => sum + move[axis] * move[2], 0)
    const [mx, my] = [mean(0), mean(1)]
    const { recurrence, grade } = classifyCountable(model, plain)
    if (mx === 0 && my === 0) {
      expect([round, grade]).toEqual([round, 'open'])
      continue
    }
    // Along an axis only where the other coordinate falls back.
    const drifts = [my < 0 ? axisDrift(inside, first, 0) : undefined, mx < 0 ? axisDrift(inside, second, 1) : undefined]
    const signs = drifts.flatMap((each) => (each === undefined ? [] : [Math.abs(each) < 1e-9 ? 0 : Math.sign(each)]))
    const expected =
      signs.length === 0 || signs.includes(1)
        ? 'transient'
        : signs.includes(0)
          ? 'null recurrent'
          : 'positive recurrent'
    tally.set(expected, (tally.get(expected) ?? 0) + 1)
    expect([round, recurrence, grade]).toEqual([
      round,
      expected,
      expected === 'null recurrent' ? 'indicated' : 'proved',
    ])
  }
  expect(tally.get('transient')).toBeGreaterThan(40)
  expect(tally.get('positive recurrent')).toBeGreaterThan(20)
}, 60_000)
