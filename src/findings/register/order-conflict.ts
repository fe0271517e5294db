/**
 * A broken key on which no read can be blamed: its operations want two orders at once.
 */
import { cycleEdges, precedenceGraph, shortestCycle } from '../../order/precedence-graph.js'
import type { Link, RawFinding } from '../raw-finding.js'
import { Teller } from '../telling.js'
import { complete, toOperations } from './evidence.js'
import type { Newer } from './newer.js'

/** Versions that the graph of suspects may have. */
export const GRAPH_LIMIT = 120

/** The order-conflict finding of a key, with a shortest cycle among the suspects. */
export function orderConflict(newer: Newer, suspects: readonly number[]): RawFinding {
  const { counting, versions } = newer
  const { key } = counting
  const tell = new Teller(key)
  const graph = precedenceGraph(counting, versions, suspects.slice(0, GRAPH_LIMIT))
  const cycle = shortestCycle(graph) ?? []
  const links: Link[] = cycleEdges(graph, cycle).map(
    ({ type, before, after }) => ({ type, before, after }) as Link,
  )
  const roles = new Map<number, string>()
  for (const v of cycle)
    if (versions.writer[v] >= 0) roles.set(versions.writer[v], 'one of the conflicting writes')
  for (const { before, after } of links) {
    for (const p of [before, after]) {
      if (p >= 0 && !roles.has(p))
        roles.set(p, versions.readOf[p] >= 0 ? 'a reader that takes sides' : 'on the way')
    }
  }
  if (roles.size === 0) {
    // A cas that took effect on a value that was never there, or a circle of cas.
    const p = versions.impossibleCas >= 0 ? versions.impossibleCas : firstCas(newer)
    roles.set(p, 'a cas that could not have taken effect')
    for (
      let i = newer.members.offset[versions.writeOf[p]];
      i < newer.members.offset[versions.writeOf[p] + 1];
      i++
    ) {
      roles.set(
        newer.members.operations[i],
        roles.get(newer.members.operations[i]) ?? 'a read that shows that it took effect',
      )
    }
  }
  const evidence = complete(newer, roles, links)
  const blamed = Math.max(...evidence.exhibits.map(({ p }) => p))
  return {
    kind: 'order-conflict',
    also: [],
    keyId: key.keyId,
    blamed: key.operation[blamed],
    cause: -1,
    ...toOperations(newer, evidence),
    summary: sentence(newer, tell, cycle, roles),
  }
}

function sentence(
  newer: Newer,
  tell: Teller,
  cycle: readonly number[],
  roles: ReadonlyMap<number, string>,
): string {
  const { versions, counting } = newer
  const { key } = counting
  const name = (v: number): string =>
    tell.value(v === 0 ? versions.initialValue : key.value[versions.writer[v]])
  if (cycle.length === 0) {
    return `A cas on ${tell.keyName} took effect although the value it expected was never there.`
  }
  const readers = [...roles.keys()].filter((p) => versions.readOf[p] >= 0 && versions.writeOf[p] < 0)
  const clients = new Set(readers.map((p) => tell.client(p)))
  if (cycle.length === 2 && clients.size > 1) {
    const [one, other] = [...clients]
    return `Two readers disagree which write of ${tell.keyName} came last, ${cycle.map(name).join(' or ')}: ${one} and ${other} saw the one order and the other. This is what diverged replicas look like.`
  }
  return `The versions ${cycle.map(name).join(', ')} of ${tell.keyName} cannot be put in one order: each must come before the next, and the last before the first.`
}

function firstCas(newer: Newer): number {
  const { found, writer } = newer.versions
  return writer[found.findIndex((v) => v >= 0)]
}
