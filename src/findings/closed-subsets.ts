/**
 * Which operations must go along when one is taken away, where a read does not say which write it saw: a write stays
 * while a read stays that may have seen it or what it led to. What is left out then explains nothing away.
 */
import { CAS, DELETE, INCREMENT, NO_VALUE, type Values, WRITE } from '../history/columns.js'
import type { Counting } from '../order/counting.js'
import { precedes } from '../order/precedence.js'
import { isRead, isWrite, readValue } from '../order/roles.js'
import type { Dependents } from './shrink.js'

/** The dependents of each operation of a key on which reads are ambiguous, or that mixes increments with writes. */
export function closedSubsets(counting: Counting, values: Values): Dependents {
  const { key, rule } = counting
  const local = new Map<number, number>()
  for (let p = 0; p < key.n; p++) local.set(key.operation[p], p)
  const overwritten = rule.writeRead === 'all' ? overwrittenBy(counting) : undefined
  // A value that was written must not look like one that nobody wrote.
  const isWrittenAmong = (r: number, among: ReadonlySet<number>): boolean => {
    if (mayHaveStarted(counting, r)) return true
    for (const i of among)
      if (isWrite(key, local.get(i)!) && mayHaveSeen(counting, local.get(i)!, r)) return true
    return false
  }
  const needsNumbers = key.hasIncrements && key.hasWrites && hasOtherValues(counting, values)
  return function* (removed, among) {
    const w = local.get(removed)!
    if (!isWrite(key, w)) return
    for (const other of among) {
      const r = local.get(other)!
      if (!finds(counting, r, needsNumbers)) continue
      const isOut =
        (precedes(key, r, w) && (rule.readWrite === 'all' || saysWhatItSaw(counting, r))) ||
        (overwritten !== undefined && overwritten[w] < key.start[r])
      if (key.hasIncrements) {
        if (!isOut) yield other
      } else if (mayHaveSeen(counting, w, r) && (!isOut || !isWrittenAmong(r, among))) {
        yield other
      }
    }
  }
}

/** These operations and all writes that must stay while they do. O(n · operations). */
export function closedOver(counting: Counting, values: Values, operations: Iterable<number>): Set<number> {
  const { key } = counting
  const dependents = closedSubsets(counting, values)
  const own = new Set(key.operation)
  const kept = new Set([...operations].filter((i) => own.has(i)))
  const isNeeded = (i: number): boolean => {
    for (const _ of dependents(i, kept)) return true
    return false
  }
  for (let again = true; again; ) {
    again = false
    for (let p = key.n - 1; p >= 0; p--) {
      const i = key.operation[p]
      if (kept.has(i) || !isWrite(key, p) || !isNeeded(i)) continue
      kept.add(i)
      // What a plain write found does not matter: only what finds something needs sources of its own.
      if (isRead(key, p) || key.kind[p] === CAS || key.kind[p] === INCREMENT) again = true
    }
  }
  return kept
}

/** Whether what was there mattered to the operation. */
function finds({ key }: Counting, p: number, needsNumbers: boolean): boolean {
  return isRead(key, p) || key.kind[p] === CAS || (needsNumbers && key.kind[p] === INCREMENT)
}

/** A failed cas that does not say so may stand after a write that it precedes, where the promise does not count that. */
function saysWhatItSaw({ key }: Counting, p: number): boolean {
  return !isRead(key, p) || readValue(key, p) !== NO_VALUE
}

/** Whether a write's value is one that the operation may have found. */
function mayHaveSeen({ key }: Counting, w: number, p: number): boolean {
  const wanted = isRead(key, p) ? readValue(key, p) : key.extra[p]
  return wanted === NO_VALUE ? key.value[w] !== key.extra[p] : key.value[w] === wanted
}

/** Whether the initial value is one that the operation may have found. */
function mayHaveStarted({ key }: Counting, p: number): boolean {
  const wanted = isRead(key, p) ? readValue(key, p) : key.extra[p]
  return wanted === NO_VALUE ? key.initial !== key.extra[p] : key.initial === wanted
}

/** Local index → when, certainly, an acked blind write that certainly followed it was done. */
function overwrittenBy({ key }: Counting): Float64Array {
  const { n } = key
  const isBlind = (p: number): boolean =>
    key.acked[p] === 1 && (key.kind[p] === WRITE || key.kind[p] === DELETE)
  const blind: number[] = []
  for (let p = 0; p < n; p++) if (isBlind(p)) blind.push(p)
  const least = new Float64Array(blind.length + 1).fill(Number.POSITIVE_INFINITY)
  for (let i = blind.length - 1; i >= 0; i--) least[i] = Math.min(least[i + 1], key.sureEnd[blind[i]])
  return Float64Array.from({ length: n }, (_, p) => {
    if (key.acked[p] === 0) return Number.POSITIVE_INFINITY
    let low = 0
    let high = blind.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (key.start[blind[middle]] > key.sureEnd[p]) high = middle
      else low = middle + 1
    }
    return least[low]
  })
}

/** Whether the key may hold what nothing can be added to. */
function hasOtherValues({ key }: Counting, values: Values): boolean {
  const isOther = (value: number): boolean => value > 0 && values.integer(value) === undefined
  if (key.initial === NO_VALUE || isOther(key.initial)) return true
  for (let p = 0; p < key.n; p++)
    if (key.kind[p] !== INCREMENT && isWrite(key, p) && isOther(key.value[p])) return true
  return false
}
