/**
 * The evidence of a blamed read: the operations, and why each must come before the next.
 */
import type { Exhibit, Link } from '../raw-finding.js'
import { observer, type Proof } from './blame.js'
import type { Newer } from './newer.js'

/** Exhibits and links in local indices; `toOperations` turns them into operation indices. */
export interface Evidence {
  readonly exhibits: { p: number; role: string }[]
  readonly links: Link[]
}

/** Evidence that `read` of `version` comes after something newer. */
export function readEvidence(newer: Newer, version: number, read: number, proof: Proof): Evidence {
  const { versions } = newer
  const write = versions.writer[proof.newer]
  const links: Link[] = []
  if (proof.observedBy !== undefined) {
    const q = proof.observedBy
    links.push({ type: 'pair', before: observer(newer, version, q), after: q })
    if (proof.via !== q) links.push({ type: 'pair', before: q, after: read })
  } else {
    links.push(...newer.path(version, proof.newer))
  }
  if (proof.via !== write) links.push({ type: 'returned', before: write, after: proof.via })
  links.push({ type: 'pair', before: proof.via, after: read })
  links.push({ type: 'overwritten', before: read, after: write })

  const roles = new Map<number, string>()
  if (versions.writer[version] >= 0) roles.set(versions.writer[version], 'the write of what it returned')
  roles.set(write, 'the overwriting write')
  if (proof.via !== write) roles.set(proof.via, 'a read that saw it')
  roles.set(read, 'the blamed read')
  return complete(newer, roles, links)
}

/** Adds the operations that links name, and the write of every version that one of them returned or found. */
export function complete(newer: Newer, roles: Map<number, string>, links: Link[]): Evidence {
  const { versions } = newer
  for (const link of links) {
    for (const p of [link.before, link.after])
      if (p >= 0 && !roles.has(p)) roles.set(p, 'on the way between them')
  }
  const waiting = [...roles.keys()]
  for (let p = waiting.pop(); p !== undefined; p = waiting.pop()) {
    const needed = [versions.readOf[p], versions.writeOf[p] > 0 ? versions.found[versions.writeOf[p]] : -1]
    for (const v of needed) {
      const write = v > 0 ? versions.writer[v] : -1
      if (write < 0) continue
      if (!roles.has(write)) {
        roles.set(write, 'the write of what it returned')
        waiting.push(write)
      }
      const known = links.some((l) => l.before === write && l.after === p && l.type !== 'pair')
      if (!known && versions.readOf[p] === v) {
        links.push({ type: versions.writeOf[p] > 0 ? 'found' : 'returned', before: write, after: p })
      }
    }
  }
  const exhibits = [...roles].map(([p, role]) => ({ p, role })).sort((a, b) => a.p - b.p)
  return { exhibits, links }
}

/** Local indices → operation indices. */
export function toOperations(newer: Newer, evidence: Evidence): { exhibits: Exhibit[]; links: Link[] } {
  const { operation } = newer.counting.key
  const at = (p: number): number => (p < 0 ? -1 : operation[p])
  return {
    exhibits: evidence.exhibits.map(({ p, role }) => ({ operation: operation[p], role })),
    links: evidence.links.map(
      (link) => ({ ...link, before: at(link.before), after: at(link.after) }) as Link,
    ),
  }
}
