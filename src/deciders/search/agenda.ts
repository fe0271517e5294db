/**
 * When the search has to think of an operation: from when on it may be placed, and by when it must have been.
 *
 * The search walks through time and places operations only where one must be placed: a write when it is certainly
 * over (every write that starts later comes after it, under every promise), a read likewise where the promise counts
 * reads before writes. So an operation that comes after whatever is placed before its start need not be thought of
 * before it starts; a read that a promise leaves free has to be thought of from the moment its predecessors are.
 */
import { NO_VALUE } from '../../history/columns.js'
import { type Counting, counts } from '../../order/counting.js'
import type { KeyHistory } from '../../order/key-history.js'
import { precedes } from '../../order/precedence.js'
import { isRead, isWrite, readValue } from '../../order/roles.js'

/** Whether local `a` must stand before local `b` in the sequence, if both are in it. O(1). */
export function mustPrecede(counting: Counting, a: number, b: number): boolean {
  const { key } = counting
  if (a === b || key.acked[a] === 0) return false
  const aReads = isRead(key, a)
  const aWrites = isWrite(key, a)
  const bReads = isRead(key, b)
  const bWrites = isWrite(key, b)
  if (aWrites && bWrites && counts(counting, a, 'write', b, 'write')) return true
  if (aWrites && bReads && counts(counting, a, 'write', b, 'read')) return true
  if (aReads && bWrites && counts(counting, a, 'read', b, 'write')) return true
  if (aReads && bReads && counts(counting, a, 'read', b, 'read')) return true
  // Nobody reads the future: on a counter a read comes before the increments that it precedes.
  return aReads && bWrites && key.hasIncrements && !key.hasWrites && precedes(key, a, b)
}

export interface Agenda {
  /** local index → time from which it may be placed; -Infinity: from the beginning */
  readonly from: Float64Array
  /** local index → time by which it must have been placed; Infinity: by the end (an unsure one: never) */
  readonly by: Float64Array
  /** local index → 1 for a read that can no longer be answered after `by`, but that nothing forces before */
  readonly expires: Uint8Array
  /** what to do in order of time: p: it may be placed from now on; -1 - p: it must have been placed by now */
  readonly steps: Int32Array
}

/** Makes the agenda of a key. O(n log n), and the writes of a value a read where the promise leaves reads free. */
export function makeAgenda(counting: Counting): Agenda {
  const { key, rule } = counting
  const { n } = key
  const isCounter = key.hasIncrements && !key.hasWrites
  const writesInTime = !isCounter || (rule.counterWriteWrite === 'all' && rule.writeRead === 'all')
  const readsInTime = rule.readWrite === 'all' || isCounter
  const from = Float64Array.from(key.start)
  const by = new Float64Array(n).fill(Number.POSITIVE_INFINITY)
  const expires = new Uint8Array(n)
  if (rule.readRead !== 'all') putFirstChances(counting, from)
  for (let p = 0; p < n; p++) {
    if (key.acked[p] === 1 && (isWrite(key, p) ? writesInTime : readsInTime)) by[p] = key.sureEnd[p]
  }
  if (!readsInTime && !key.hasIncrements) putLastChances(counting, from, by, expires)
  return { from, by, expires, steps: sortSteps(key, from, by, expires) }
}

/**
 * Where reads may stand before operations that are over: a read may be placed from the latest start of what must come
 * before it.
 */
function putFirstChances(counting: Counting, from: Float64Array): void {
  const { key, rule } = counting
  const lastRead = new Map<number, number>()
  const lastWrite = new Map<number, number>()
  for (let p = 0; p < key.n; p++) {
    const client = key.client[p]
    if (isRead(key, p)) {
      if (!isWrite(key, p)) {
        const write = lastWriteBefore(counting, p, lastWrite.get(client) ?? -1)
        const read = rule.readRead === 'session' ? (lastRead.get(client) ?? -1) : -1
        from[p] = Math.max(
          write < 0 ? Number.NEGATIVE_INFINITY : from[write],
          read < 0 ? Number.NEGATIVE_INFINITY : from[read],
        )
      }
      lastRead.set(client, p)
    }
    if (key.acked[p] === 1 && isWrite(key, p)) lastWrite.set(client, p)
  }
}

/** The last write to start of those that must come before a read, or -1. */
function lastWriteBefore(counting: Counting, read: number, ownLast: number): number {
  const { key, rule } = counting
  if (rule.writeRead === 'none') return -1
  if (rule.writeRead === 'session') return ownLast
  if (rule.writeRead === 'closing' && counting.closing![read] === 0) return -1
  // Local order is by start, and what precedes the read stands before it.
  for (let w = read - 1; w >= 0; w--) {
    if (key.acked[w] === 1 && isWrite(key, w) && counts(counting, w, 'write', read, 'read')) return w
  }
  return -1
}

/** A read that nothing forces can no longer be answered once every write of its value is over and overwritten. */
function putLastChances(counting: Counting, from: Float64Array, by: Float64Array, expires: Uint8Array): void {
  const { key } = counting
  const writers = new Map<number, number[]>()
  for (let p = 0; p < key.n; p++) {
    if (!isWrite(key, p)) continue
    const others = writers.get(key.value[p])
    if (others) others.push(p)
    else writers.set(key.value[p], [p])
  }
  for (let p = 0; p < key.n; p++) {
    if (!isRead(key, p) || isWrite(key, p)) continue
    const wanted = readValue(key, p)
    if (wanted === NO_VALUE) continue
    let last = from[p]
    for (const w of writers.get(wanted) ?? []) {
      if (by[w] > last && !precedes(key, p, w)) last = by[w]
    }
    by[p] = last
    if (last !== Number.POSITIVE_INFINITY) expires[p] = 1
  }
}

/** By time; what begins before what ends, and of what ends the reads that expire last. */
function sortSteps(key: KeyHistory, from: Float64Array, by: Float64Array, expires: Uint8Array): Int32Array {
  const steps: number[] = []
  for (let p = 0; p < key.n; p++) {
    steps.push(p)
    if (key.acked[p] === 1) steps.push(-1 - p)
  }
  const time = (step: number): number => (step >= 0 ? from[step] : by[-1 - step])
  const rank = (step: number): number => (step >= 0 ? 0 : expires[-1 - step] === 0 ? 1 : 2)
  const place = (step: number): number => (step >= 0 ? step : -1 - step)
  return Int32Array.from(
    steps.sort((a, b) => compare(time(a), time(b)) || rank(a) - rank(b) || place(a) - place(b)),
  )
}

function compare(a: number, b: number): number {
  return a < b ? -1 : a > b ? 1 : 0
}
