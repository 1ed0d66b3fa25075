/** Vertices in order of elimination, in groups; a group comes after those that it separates. */
export interface Dissection {
  /** Length n. */
  readonly order: Int32Array
  /** Length groups + 1, into `order`. */
  readonly pivotStart: Int32Array
  /** Group that separates this one from others, -1 for the last. */
  readonly parent: Int32Array
}

/** Groups of so few vertices are eliminated as one dense matrix: cutting them further saves nothing. */
const smallest = 24

/** A cut whose separator is no smaller than this part of the smaller side is not worth making. */
const poorestCut = 1

/** A vertex subset, cut: `side` is 0 or 1, 2 in the separator; in the order of the subset. */
interface Cut {
  readonly side: Uint8Array
  readonly counts: readonly [number, number, number]
}

/**
 * Orders a graph for elimination by cutting it in two, the separator last, and each half likewise: through the middle
 * of a coordinate where the vertices have any, else through the middle level of a breadth-first search.
 *
 * Source: George 1973; level structures: George and Liu 1978 (from memory).
 *
 * @param start, neighbour compressed rows of a symmetric pattern; pairs may stand more than once
 * @param last a vertex that becomes the last one of the last group
 */
export function dissect(
  start: Int32Array,
  neighbour: Int32Array,
  coordinates: { readonly values: Int32Array; readonly width: number },
  last?: number,
): Dissection {
  const n = start.length - 1
  const order = new Int32Array(n)
  for (let v = 0; v < n; v++) order[v] = v
  if (last !== undefined) {
    order[last] = n - 1
    order[n - 1] = last
  }
  const free = last === undefined ? n : n - 1
  const pivotStart: number[] = [0]
  const parent: number[] = []
  /** Segment of each vertex: neighbours outside the one that is being cut don't count. */
  const segment = new Int32Array(n)
  if (last !== undefined) segment[last] = -1
  let segments = 0
  const workspace = { level: new Int32Array(n), queue: new Int32Array(n) }

  /** Orders order[low] … order[high - 1]; depth stays logarithmic, since a cut leaves no side above 19/20. */
  const split = (low: number, high: number): number[] => {
    const size = high - low
    const vertices = order.slice(low, high)
    const cut = size <= smallest ? undefined : bestCut(vertices, { start, neighbour, segment }, coordinates, workspace)
    if (cut === undefined) {
      if (size === 0) return []
      pivotStart.push(high)
      parent.push(-1)
      return [parent.length - 1]
    }
    const [left, right, separator] = cut.counts
    const next = [low, low + left, low + left + right]
    const name = segments + 1
    segments += 2
    for (let k = 0; k < size; k++) {
      const side = cut.side[k]
      order[next[side]++] = vertices[k]
      segment[vertices[k]] = side === 2 ? -1 : name + side
    }
    const below = [...split(low, low + left), ...split(low + left, low + left + right)]
    if (separator === 0) return below
    pivotStart.push(high)
    parent.push(-1)
    const group = parent.length - 1
    for (const child of below) parent[child] = group
    return [group]
  }

  const roots = split(0, free)
  if (last !== undefined) {
    // The last vertex joins the last group where that is the only root, else it is a group of its own.
    if (roots.length === 1) pivotStart[pivotStart.length - 1] = n
    else {
      pivotStart.push(n)
      parent.push(-1)
      for (const root of roots) parent[root] = parent.length - 1
    }
  } else for (const root of roots.slice(0, -1)) parent[root] = parent.length - 1
  return { order, pivotStart: Int32Array.from(pivotStart), parent: Int32Array.from(parent) }
}

interface SegmentedGraph {
  readonly start: Int32Array
  readonly neighbour: Int32Array
  readonly segment: Int32Array
}

function bestCut(
  vertices: Int32Array,
  graph: SegmentedGraph,
  { values, width }: { readonly values: Int32Array; readonly width: number },
  workspace: { level: Int32Array; queue: Int32Array },
): Cut | undefined {
  let best: Cut | undefined
  let bestScore = poorestCut
  const consider = (cut: Cut | undefined) => {
    if (cut === undefined) return
    const [left, right, separator] = cut.counts
    const smaller = Math.min(left, right)
    if (smaller * 20 < vertices.length) return
    const score = separator / smaller
    if (score < bestScore) {
      best = cut
      bestScore = score
    }
  }
  for (let coordinate = 0; coordinate < width; coordinate++) {
    const position = (v: number) => values[v * width + coordinate]
    consider(cutAt(vertices, graph, position, workspace.level))
  }
  // Where a coordinate cuts about as well as on a square grid, the search is spared.
  const squareGrid = 1.5 * Math.sqrt(vertices.length)
  if (best === undefined || best.counts[2] > squareGrid) {
    levels(vertices, graph, workspace)
    const { level } = workspace
    consider(cutAt(vertices, graph, (v) => level[v], workspace.queue))
  }
  return best
}

/** Cuts between positions up to the median and beyond it; the separator is the smaller of the two sides' edges. */
function cutAt(
  vertices: Int32Array,
  { start, neighbour, segment }: SegmentedGraph,
  position: (vertex: number) => number,
  mark: Int32Array,
): Cut | undefined {
  const size = vertices.length
  const step = Math.ceil(size / 1001)
  const sample: number[] = []
  for (let k = 0; k < size; k += step) sample.push(position(vertices[k]))
  sample.sort((a, b) => a - b)
  if (sample[0] === sample[sample.length - 1]) return undefined
  let middle = sample[sample.length >> 1]
  if (middle === sample[sample.length - 1]) middle = sample.findLast((value) => value < middle) as number
  for (let k = 0; k < size; k++) mark[vertices[k]] = position(vertices[k]) <= middle ? 0 : 1
  const own = segment[vertices[0]]
  const touching = new Uint8Array(size)
  const edge = [0, 0]
  const whole = [0, 0]
  for (let k = 0; k < size; k++) {
    const v = vertices[k]
    const side = mark[v]
    whole[side]++
    for (let arc = start[v]; arc < start[v + 1]; arc++) {
      const w = neighbour[arc]
      if (segment[w] === own && mark[w] !== side) {
        touching[k] = 1
        edge[side]++
        break
      }
    }
  }
  const given = edge[0] <= edge[1] ? 0 : 1
  const side = new Uint8Array(size)
  for (let k = 0; k < size; k++) side[k] = touching[k] === 1 && mark[vertices[k]] === given ? 2 : mark[vertices[k]]
  const counts: [number, number, number] = [whole[0], whole[1], edge[given]]
  counts[given] -= edge[given]
  return { side, counts }
}

/** Breadth-first levels from a vertex far out; further pieces of the graph go on counting. */
function levels(
  vertices: Int32Array,
  { start, neighbour, segment }: SegmentedGraph,
  { level, queue }: { level: Int32Array; queue: Int32Array },
): void {
  const own = segment[vertices[0]]
  const search = (root: number): void => {
    for (const v of vertices) level[v] = -1
    let tail = 0
    let head = 0
    let nextRoot = 0
    let first = root
    let offset = 0
    while (tail < vertices.length) {
      level[first] = offset
      queue[tail++] = first
      while (head < tail) {
        const v = queue[head++]
        for (let arc = start[v]; arc < start[v + 1]; arc++) {
          const w = neighbour[arc]
          if (segment[w] === own && level[w] === -1) {
            level[w] = level[v] + 1
            queue[tail++] = w
          }
        }
      }
      if (tail === vertices.length) return
      offset = level[queue[tail - 1]] + 1
      while (level[vertices[nextRoot]] !== -1) nextRoot++
      first = vertices[nextRoot]
    }
  }
  search(vertices[0])
  search(queue[vertices.length - 1])
}
