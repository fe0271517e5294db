/**
 * The suspect part of a key as a graph: versions as nodes, "must come before" as edges, each with the link that
 * witnesses it. For parts that people look at: some hundred versions, not a million.
 */
import { DirectedGraph } from 'graphology'
import { stronglyConnectedComponents } from 'graphology-components'
import { hasCycle, topologicalGenerations } from 'graphology-dag'
import { singleSource } from 'graphology-shortest-path/unweighted.js'
import type { Role } from '../promises/promise.js'
import { type Counting, counts } from './counting.js'
import { isRead, isWrite } from './roles.js'
import { placeOfRead } from './version-orders.js'
import type { Versions } from './versions.js'

/** Node: one version. Local indices. */
export interface VersionNode {
  /** local index of its write, -1 for the initial value */
  readonly writer: number
  readonly members: readonly number[]
}

/** Edge: why the one must come before the other. Local indices, -1 for the initial value. */
export interface MustPrecede {
  readonly type: 'pair' | 'found' | 'initial'
  readonly before: number
  readonly after: number
  /** how much clock error it survives, in the key's own time; Infinity when no clock explains it */
  readonly slack: number
  /** chains of cas that carry the link over to these versions: each stands directly after the version it found */
  readonly chained?: readonly { readonly before: number; readonly after: number }[]
}

export type PrecedenceGraph = DirectedGraph<VersionNode, MustPrecede>

/** Builds the graph over some versions. O(versions² · members²) at worst: keep it small. */
export function precedenceGraph(
  counting: Counting,
  versions: Versions,
  part: readonly number[],
): PrecedenceGraph {
  const graph: PrecedenceGraph = new DirectedGraph()
  const members = new Map<number, number[]>(part.map((v) => [v, []]))
  for (let p = 0; p < counting.key.n; p++) {
    const written = versions.writeOf[p]
    if (written >= 0) members.get(written)?.push(p)
    if (versions.readOf[p] >= 0) members.get(versions.readOf[p])?.push(p)
  }
  for (const v of part) graph.addNode(v, { writer: versions.writer[v], members: members.get(v)! })
  for (const v of part) {
    for (const w of part) {
      if (v === w) continue
      const edge = bestEdge(counting, versions, v, members.get(v)!, w, members.get(w)!)
      if (edge) graph.addEdge(v, w, edge)
    }
  }
  carryOver(graph, versions)
  return graph
}

/**
 * A version written by a cas stands directly after the one it found: what must come before it must come before
 * that one too, and what that one must precede comes after it. Adds these edges until there are no more.
 */
function carryOver(graph: PrecedenceGraph, versions: Versions): void {
  const chained = graph
    .nodes()
    .map(Number)
    .filter((w) => versions.found[w] >= 0 && graph.hasNode(versions.found[w]))
  for (let again = true; again; ) {
    again = false
    for (const w of chained) {
      const v = versions.found[w]
      const link = { before: versions.writer[v], after: versions.writer[w] }
      const carry = (from: number, to: number, known: MustPrecede): void => {
        if (from === to || graph.hasEdge(from, to)) return
        graph.addEdge(from, to, { ...known, chained: [...(known.chained ?? []), link] })
        again = true
      }
      for (const x of graph.inNeighbors(w).map(Number))
        if (x !== v) carry(x, v, graph.getEdgeAttributes(x, w))
      for (const x of graph.outNeighbors(v).map(Number))
        if (x !== w) carry(w, x, graph.getEdgeAttributes(v, x))
    }
  }
}

function bestEdge(
  counting: Counting,
  versions: Versions,
  v: number,
  before: readonly number[],
  w: number,
  after: readonly number[],
): MustPrecede | undefined {
  const { key } = counting
  let best: MustPrecede | undefined
  const offer = (edge: MustPrecede): void => {
    if (!best || edge.slack > best.slack) best = edge
  }
  if (versions.found[w] === v) {
    offer({
      type: 'found',
      before: versions.writer[v],
      after: versions.writer[w],
      slack: Number.POSITIVE_INFINITY,
    })
  }
  if (v === 0)
    offer({ type: 'initial', before: -1, after: versions.writer[w], slack: Number.POSITIVE_INFINITY })
  for (const a of before) {
    for (const b of after) {
      if (a === b || !someRolesCount(counting, versions, v, a, w, b)) continue
      const oneClock = key.client[a] === key.client[b] || key.host[a] === key.host[b]
      offer({
        type: 'pair',
        before: a,
        after: b,
        slack: oneClock ? Number.POSITIVE_INFINITY : key.start[b] - key.end[a],
      })
    }
  }
  return best
}

/** Whether a, as a member of v, before b, as a member of w, counts. */
function someRolesCount(
  counting: Counting,
  versions: Versions,
  v: number,
  a: number,
  w: number,
  b: number,
): boolean {
  const { key } = counting
  const roles = (version: number, p: number): Role[] => {
    const all: Role[] = []
    if (isWrite(key, p) && versions.writeOf[p] === version) all.push('write')
    if (isRead(key, p) && placeOfRead(versions, p) === version) all.push('read')
    return all
  }
  return roles(v, a).some((ra) => roles(w, b).some((rb) => counts(counting, a, ra, b, rb)))
}

/**
 * A shortest cycle of versions, of equally short ones the one that survives the most clock error, or undefined
 * when the graph has none.
 */
export function shortestCycle(graph: PrecedenceGraph): number[] | undefined {
  if (!hasCycle(graph)) return undefined
  let best: { cycle: number[]; slack: number } | undefined
  for (const component of stronglyConnectedComponents(graph)) {
    if (component.length < 2) continue
    for (const start of component) {
      const paths = singleSource(graph, start)
      for (const last of graph.inNeighbors(start)) {
        const path = paths[last]
        if (!path || (best && path.length > best.cycle.length)) continue
        const cycle = path.map(Number)
        const slack = cycleSlack(graph, cycle)
        if (!best || cycle.length < best.cycle.length || slack > best.slack) best = { cycle, slack }
      }
    }
  }
  return best?.cycle
}

/** The edges of a cycle given by its nodes. */
export function cycleEdges(graph: PrecedenceGraph, cycle: readonly number[]): MustPrecede[] {
  return cycle.map((v, i) => graph.getEdgeAttributes(v, cycle[(i + 1) % cycle.length]))
}

function cycleSlack(graph: PrecedenceGraph, cycle: readonly number[]): number {
  return Math.min(...cycleEdges(graph, cycle).map((edge) => edge.slack))
}

/** The versions of an acyclic graph in generations, oldest first: what may come in any order stands together. */
export function generations(graph: PrecedenceGraph): number[][] {
  return topologicalGenerations(graph).map((generation) => generation.map(Number))
}
