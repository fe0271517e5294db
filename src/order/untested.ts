/**
 * Whether a promise was put to the test on a key at all: a check of nothing must not pass for a check.
 */
import type { PairRule, Role } from '../promises/promise.js'
import { type Counting, counts, scopeOf } from './counting.js'
import { isRead, isWrite } from './roles.js'

/** What the bound on versions looks at. */
const ALL_WRITES_BEFORE_READS: PairRule = {
  name: 'bounded-staleness',
  counterWriteWrite: 'none',
  writeRead: 'all',
  readWrite: 'none',
  readRead: 'none',
}

/**
 * True when none of the pairs that the promise adds to write–write bounds a read on this key: no read after a
 * write (read–read for monotonic-reads, read–write for writes-follow-reads), no closing read; for a promise that
 * adds no pairs, no read at all. O(n).
 */
export function isUntested(counting: Counting): boolean {
  const { rule } = counting
  if (rule.versions !== undefined && hasPair({ ...counting, rule: ALL_WRITES_BEFORE_READS }, 'write', 'read'))
    return false
  if (rule.writeRead !== 'none') return !hasPair(counting, 'write', 'read')
  if (rule.readRead !== 'none') return !hasPair(counting, 'read', 'read')
  if (rule.readWrite !== 'none') return !hasPair(counting, 'read', 'write')
  return rule.versions !== undefined || !hasRead(counting)
}

function hasRead({ key }: Counting): boolean {
  for (let p = 0; p < key.n; p++) if (isRead(key, p)) return true
  return false
}

/** Whether any pair (a in role ra, b in role rb) counts. */
function hasPair(counting: Counting, ra: Role, rb: Role): boolean {
  const { key, rule } = counting
  const scope = scopeOf(key, rule, ra, rb)
  const isA = ra === 'write' ? isWrite : isRead
  const isB = rb === 'write' ? isWrite : isRead
  // In session order it is enough to try each client's first a with its later b's.
  const firstOfClient = new Map<number, number>()
  // Across clients it is enough to try the earliest end so far, of all and of each host.
  let earliest = -1
  const earliestOfHost = new Map<number, number>()
  const sure = counting.delays && scope === 'late' ? counting.delays.sureEnd : key.sureEnd
  for (let b = 0; b < key.n; b++) {
    if (isB(key, b)) {
      const first = firstOfClient.get(key.client[b])
      if (first !== undefined && counts(counting, first, ra, b, rb)) return true
      if (scope !== 'session') {
        if (earliest >= 0 && counts(counting, earliest, ra, b, rb)) return true
        const onHost = earliestOfHost.get(key.host[b])
        if (onHost !== undefined && counts(counting, onHost, ra, b, rb)) return true
      }
    }
    if (key.acked[b] === 1 && isA(key, b)) {
      if (!firstOfClient.has(key.client[b])) firstOfClient.set(key.client[b], b)
      if (earliest < 0 || sure[b] < sure[earliest]) earliest = b
      const onHost = earliestOfHost.get(key.host[b])
      if (onHost === undefined || key.end[b] < key.end[onHost]) earliestOfHost.set(key.host[b], b)
    }
  }
  return false
}
