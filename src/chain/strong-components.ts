/** Strongly connected components of a directed graph. */
export interface StrongComponents {
  readonly count: number
  /** Component of each vertex, length n; every arc between components leads to a smaller number. */
  readonly componentOf: Int32Array
}

/**
 * Tarjan's algorithm without recursion: a path of a million states needs no deeper call stack than one of two.
 *
 * Source: Tarjan 1972. Different: the depth-first path is an array of vertices with the next arc of each, so the
 * whole workspace is five integer arrays of length n.
 *
 * @param rowStart length n + 1, `target` the heads of the arcs: compressed rows
 * @cost linear in vertices and arcs
 */
export function strongComponents(rowStart: Int32Array, target: Int32Array): StrongComponents {
  const n = rowStart.length - 1
  const componentOf = new Int32Array(n).fill(-1)
  const found = new Int32Array(n).fill(-1) // order of discovery, -1 where not yet seen
  const lowest = new Int32Array(n) // smallest order of discovery known to be reachable within the component
  const nextArc = new Int32Array(n)
  const path = new Int32Array(n)
  const open = new Int32Array(n) // discovered, component not yet known
  let openCount = 0
  let clock = 0
  let count = 0
  for (let root = 0; root < n; root++) {
    if (found[root] !== -1) continue
    let depth = 0
    path[0] = root
    found[root] = lowest[root] = clock++
    nextArc[root] = rowStart[root]
    open[openCount++] = root
    while (depth >= 0) {
      const vertex = path[depth]
      const arc = nextArc[vertex]
      if (arc < rowStart[vertex + 1]) {
        nextArc[vertex] = arc + 1
        const head = target[arc]
        if (found[head] === -1) {
          found[head] = lowest[head] = clock++
          nextArc[head] = rowStart[head]
          open[openCount++] = head
          path[++depth] = head
        } else if (componentOf[head] === -1 && found[head] < lowest[vertex]) lowest[vertex] = found[head]
        continue
      }
      if (lowest[vertex] === found[vertex]) {
        let member = -1
        while (member !== vertex) {
          member = open[--openCount]
          componentOf[member] = count
        }
        count++
      }
      depth--
      if (depth >= 0 && lowest[vertex] < lowest[path[depth]]) lowest[path[depth]] = lowest[vertex]
    }
  }
  return { count, componentOf }
}
