/**
 * The findings of `no-lost-updates`: updates that were computed from one version.
 */
import { findLostUpdates, type UpdatesOfOneValue } from '../deciders/lost-updates.js'
import type { Counting } from '../order/counting.js'
import { findVersions, type Versions } from '../order/versions.js'
import { inOrder } from './in-order.js'
import type { Exhibit, Link, RawFinding } from './raw-finding.js'
import { plural, Teller } from './telling.js'

/** Updates of one value that are shown; all are counted. */
const SHOWN = 40

/** One finding for each value that more updates were computed from than there are versions of it. */
export function findLostUpdateFindings(counting: Counting): RawFinding[] {
  const versions = findVersions(counting.key)
  return findLostUpdates(counting.key).lost.map((lost) => finding(counting, versions, lost))
}

function finding(
  { key }: Counting,
  versions: Versions,
  { base, updates, writers }: UpdatesOfOneValue,
): RawFinding {
  const tell = new Teller(key)
  const at = (p: number): number => key.operation[p]
  // Where the value was written once, two updates are the proof; else all of them are.
  const shown = writers.length > 1 ? updates.slice(0, SHOWN) : updates.slice(0, 2)
  const roles = new Map<number, string>()
  for (const p of writers.slice(0, SHOWN)) roles.set(p, 'a write of what they were computed from')
  for (const p of shown) {
    roles.set(p, 'an update computed from it')
    if (key.acked[p] === 0)
      roles.set(witness(key.n, versions, p), 'a read that shows that the update took effect')
  }
  const acked = shown.filter((p) => key.acked[p] === 1)
  const blamed = acked[acked.length - 1] ?? shown[shown.length - 1]
  const links: Link[] = []
  if (writers.length === 1) {
    for (const p of shown)
      if (p !== writers[0]) links.push({ type: 'found', before: at(writers[0]), after: at(p) })
  }
  const names = [...new Set(shown.slice(0, 3).map((p) => tell.client(p)))].join(', ')
  const many = writers.length > 1 ? `only ${plural(writers.length, 'write')} of it` : 'one version'
  const exhibits: Exhibit[] = [...roles].map(([p, role]) => ({ operation: at(p), role }))
  return {
    kind: 'lost-update',
    also: [],
    keyId: key.keyId,
    blamed: at(blamed),
    cause: at(shown.find((p) => p !== blamed) ?? blamed),
    exhibits: inOrder(key, exhibits),
    links,
    summary: `${plural(updates.length, 'update')} of ${tell.keyName} (by ${names}${updates.length > 3 ? ' and others' : ''}) were computed from ${tell.value(base)}, of which there ${writers.length > 1 ? `were ${many}` : `was ${many}`}: at least one update was lost.`,
  }
}

/** A read of the version that an unsure update wrote. */
function witness(n: number, versions: Versions, update: number): number {
  for (let p = 0; p < n; p++) if (p !== update && versions.readOf[p] === versions.writeOf[update]) return p
  for (let p = 0; p < n; p++) {
    const written = versions.writeOf[p]
    if (written > 0 && versions.found[written] === versions.writeOf[update]) return p
  }
  return update
}
