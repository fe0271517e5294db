/**
 * Which write an ambiguous read of a register key can have seen, by precedence alone.
 *
 * A write that the read precedes is none; neither is, where the promise counts every write before a read, one that was
 * certainly overwritten before the read began. Where one write is left the read is resolved.
 */
import { CAS, NO_VALUE } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import { precedes } from '../../order/precedence.js'
import { isRead, isWrite, readValue } from '../../order/roles.js'

export interface Resolution {
  /** local index → the write that the read saw (-1: the initial value), UNRESOLVED where several could be it */
  readonly resolved: Int32Array
  /** the same, with a guess where several could be it: the one that was written last */
  readonly guessed: Int32Array
  /** whether every ambiguous read is resolved */
  readonly isComplete: boolean
}

/** In `resolved`: not a read whose write is known here; the read's value has to tell. */
export const UNRESOLVED = -2

const INITIAL = -1

/**
 * Resolves what precedence resolves on a register key with a known start. A read that no write is left for is given
 * the last one that was overwritten before it, which shows it stale. O(n log n), and the candidates.
 */
export function resolveReads(counting: Counting): Resolution {
  const { key } = counting
  const { n } = key
  const resolved = new Int32Array(n).fill(UNRESOLVED)
  const guessed = new Int32Array(n).fill(UNRESOLVED)
  const writersOf = groupWriters(counting)
  const overwritten = counting.rule.writeRead === 'all' ? overwrittenBy(counting) : undefined
  const initialOverwritten = overwritten ? leastEnd(counting) : Number.POSITIVE_INFINITY
  let isComplete = true
  for (let p = 0; p < n; p++) {
    const wanted = wantedValue(counting, p)
    if (wanted === undefined) continue
    if (wanted === NO_VALUE) {
      isComplete = false
      guessed[p] = lastBefore(counting, key.extra[p], p, writersOf)
      continue
    }
    const writers = writersOf.get(wanted)
    const mayBeInitial = key.initial === wanted
    if (!writers || (writers.length === 1 && !mayBeInitial)) continue
    let candidates = 0
    let last = UNRESOLVED
    let lastOverwritten = UNRESOLVED
    let firstLater = UNRESOLVED
    if (mayBeInitial) {
      if (initialOverwritten < key.start[p]) lastOverwritten = INITIAL
      else {
        candidates++
        last = INITIAL
      }
    }
    for (const w of writers) {
      if (w === p) continue
      if (precedes(key, p, w)) {
        if (firstLater === UNRESOLVED) firstLater = w
      } else if (overwritten && overwritten[w] < key.start[p]) {
        lastOverwritten = w
      } else {
        candidates++
        if (last < 0 || isLaterFor(counting, w, last, p)) last = w
      }
    }
    if (candidates > 1) isComplete = false
    const only = candidates === 0 ? (lastOverwritten === UNRESOLVED ? firstLater : lastOverwritten) : last
    if (candidates < 2) resolved[p] = only
    guessed[p] = only
  }
  return { resolved, guessed, isComplete }
}

/** What `p` found there: undefined where it found nothing, NO_VALUE where it does not say. */
function wantedValue({ key }: Counting, p: number): number | undefined {
  if (isRead(key, p)) return readValue(key, p)
  // An unsure cas that took effect found what it expected.
  return key.kind[p] === CAS && key.acked[p] === 0 ? key.extra[p] : undefined
}

/** Of two candidates, whether `a` is the likelier: done before the read began rather than not, then the later. */
function isLaterFor({ key }: Counting, a: number, b: number, read: number): boolean {
  const [aDone, bDone] = [key.end[a] <= key.start[read], key.end[b] <= key.start[read]]
  if (key.acked[a] !== key.acked[b]) return key.acked[a] === 1
  if (aDone !== bDone) return aDone
  return aDone ? key.end[a] > key.end[b] : key.start[a] < key.start[b]
}

/** The write before a failed cas that put there something else than it expected: the last that is done. */
function lastBefore(
  { key }: Counting,
  expected: number,
  p: number,
  writersOf: ReadonlyMap<number, readonly number[]>,
): number {
  let last = key.initial === expected ? UNRESOLVED : INITIAL
  for (const [value, writers] of writersOf) {
    if (value === expected) continue
    for (const w of writers) {
      if (key.acked[w] === 1 && key.end[w] <= key.start[p] && (last < 0 || key.end[w] > key.end[last]))
        last = w
    }
  }
  return last
}

function groupWriters({ key }: Counting): Map<number, number[]> {
  const writers = new Map<number, number[]>()
  for (let p = 0; p < key.n; p++) {
    if (!isWrite(key, p)) continue
    const others = writers.get(key.value[p])
    if (others) others.push(p)
    else writers.set(key.value[p], [p])
  }
  return writers
}

/** Local index → when, certainly, an acked write that certainly followed it was done. */
function overwrittenBy({ key }: Counting): Float64Array {
  const { n } = key
  // From a start on: the least certain end of acked writes that start there or later.
  const least = new Float64Array(n + 1).fill(Number.POSITIVE_INFINITY)
  for (let p = n - 1; p >= 0; p--) {
    least[p] = key.acked[p] === 1 && isWrite(key, p) ? Math.min(least[p + 1], key.sureEnd[p]) : least[p + 1]
  }
  return Float64Array.from({ length: n }, (_, p) =>
    key.acked[p] === 1 && isWrite(key, p)
      ? least[firstAfter(key.start, key.sureEnd[p])]
      : Number.POSITIVE_INFINITY,
  )
}

/** When, certainly, the first acked write was done. */
function leastEnd({ key }: Counting): number {
  let least = Number.POSITIVE_INFINITY
  for (let p = 0; p < key.n; p++)
    if (key.acked[p] === 1 && isWrite(key, p) && key.sureEnd[p] < least) least = key.sureEnd[p]
  return least
}

/** The first place of an ascending array whose number is greater. */
function firstAfter(ascending: Float64Array, number: number): number {
  let low = 0
  let high = ascending.length
  while (low < high) {
    const middle = (low + high) >> 1
    if (ascending[middle] > number) high = middle
    else low = middle + 1
  }
  return low
}
