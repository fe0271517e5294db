/**
 * Which pairs of operations a promise counts on one key (semantics.md's table).
 */
import type { PairRule, Role, Scope } from '../promises/promise.js'
import { type DelayedEnds, delayEnds } from './delays.js'
import type { KeyHistory } from './key-history.js'
import { precedes } from './precedence.js'
import { isRead, isWrite } from './roles.js'

/** A promise's rule made ready for one key. */
export interface Counting {
  readonly key: KeyHistory
  readonly rule: PairRule
  /** ends with the promise's waiting time, where it has one */
  readonly delays: DelayedEnds | undefined
  /** local index → 1 for a closing read, where the promise counts those */
  readonly closing: Uint8Array | undefined
  /** local index → the write that an ambiguous read is known to have seen (`findVersions`) */
  readonly resolved?: Int32Array
}

/** Makes a rule ready for a gathered key. */
export function countPairs(key: KeyHistory, rule: PairRule): Counting {
  const delayNs =
    rule.writeRead === 'late' ? rule.withinNs : rule.writeRead === 'closing' ? rule.settleNs : undefined
  const delays = delayNs === undefined ? undefined : delayEnds(key, delayNs)
  const closing = rule.writeRead === 'closing' ? closingReads(key, delays) : undefined
  return { key, rule, delays, closing }
}

/** The scope of pairs (a in role `ra`, b in role `rb`) under a rule. */
export function scopeOf(key: KeyHistory, rule: PairRule, ra: Role, rb: Role): Scope {
  if (ra === 'write') {
    if (rb === 'read') return rule.writeRead
    return key.hasIncrements && !key.hasWrites ? rule.counterWriteWrite : 'all'
  }
  return rb === 'read' ? rule.readRead : rule.readWrite
}

/** Whether the promise counts `a ≺ b` with the two in these roles. O(1). */
export function counts(counting: Counting, a: number, ra: Role, b: number, rb: Role): boolean {
  const { key, rule } = counting
  switch (scopeOf(key, rule, ra, rb)) {
    case 'none':
      return false
    case 'all':
      return precedes(key, a, b)
    case 'session':
      return key.client[a] === key.client[b] && precedes(key, a, b)
    case 'late':
      return startsLate(counting, a, b)
    case 'closing':
      return counting.closing![b] === 1 && precedes(key, a, b)
  }
}

function startsLate({ key, delays }: Counting, a: number, b: number): boolean {
  if (key.acked[a] === 0 || a === b) return false
  const oneClock = key.client[a] === key.client[b] || key.host[a] === key.host[b]
  return (oneClock ? delays!.end[a] : delays!.sureEnd[a]) < key.start[b]
}

/**
 * Closing reads: every acked write of the key precedes them and ended, certainly, at least the delay before.
 * Without `delays` the delay is 0. O(n log n), plus the pairs that lie within the clock error of each other.
 */
export function closingReads(key: KeyHistory, delays?: DelayedEnds): Uint8Array {
  const { n } = key
  const sureLate = delays ? delays.sureEnd : key.sureEnd
  const late = delays ? delays.end : key.end
  const writes: number[] = []
  for (let p = 0; p < n; p++) if (key.acked[p] === 1 && isWrite(key, p)) writes.push(p)
  writes.sort((a, b) => sureLate[b] - sureLate[a])
  const closing = new Uint8Array(n)
  for (let b = 0; b < n; b++) {
    if (!isRead(key, b)) continue
    closing[b] = 1
    for (const w of writes) {
      if (sureLate[w] < key.start[b]) break
      const oneClock = key.client[w] === key.client[b] || key.host[w] === key.host[b]
      if (!precedes(key, w, b) || (oneClock ? late[w] : sureLate[w]) > key.start[b]) {
        closing[b] = 0
        break
      }
    }
  }
  return closing
}
