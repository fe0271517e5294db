/**
 * Reverted values (findings.md): V seen ≺ W seen ≺ r, where r returned V again and no read after r returned W.
 */
import { counts } from '../../order/counting.js'
import { precedes } from '../../order/precedence.js'
import { type Blame, observer } from './blame.js'
import type { Newer } from './newer.js'

const LOOK_BACK = 20_000

/** How a value went back. Local indices. */
export interface Reverted {
  readonly version: number
  /** the version it went back from */
  readonly from: number
  /** a read of `version`, then one of `from`, then the blamed read */
  readonly firstSeen: number
  readonly laterSeen: number
}

/** How the blamed read shows a value gone back for good, or undefined. */
export function findReverted(newer: Newer, blame: Blame): Reverted | undefined {
  const { versions, counting, sound, members } = newer
  const { key } = counting
  const { read, version } = blame
  const { from } = newer.reach(version)
  const last = Math.max(0, read - LOOK_BACK)
  const begin = newer.beginOf(version) - newer.longestRead
  for (let q = read - 1; q >= last && key.start[q] >= begin; q--) {
    const w = versions.readOf[q]
    if (w <= 0 || w === version || !sound[q] || !counts(counting, q, 'read', read, 'read')) continue
    const firstSeen = firstRead(newer, version, q)
    if (firstSeen < 0) continue
    if (!from.has(w) && (observer(newer, version, q) < 0 || newer.isNewer(version, w))) continue
    let flaps = false
    for (let i = members.offset[w]; i < members.offset[w + 1] && !flaps; i++) {
      const p = members.operations[i]
      flaps = versions.readOf[p] === w && precedes(key, read, p)
    }
    if (!flaps) return { version, from: w, firstSeen, laterSeen: q }
  }
  return undefined
}

/** A sound read of the version that precedes `q`, or -1. */
function firstRead(newer: Newer, version: number, q: number): number {
  const { counting, versions, members, sound } = newer
  for (let i = members.offset[version]; i < members.offset[version + 1]; i++) {
    const p = members.operations[i]
    if (versions.readOf[p] !== version) continue
    if (p >= q) return -1
    if (sound[p] && counts(counting, p, 'read', q, 'read')) return p
  }
  return -1
}
