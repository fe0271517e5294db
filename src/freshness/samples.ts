/**
 * How fresh each read was: how long after the newest write before it, how long and how many writes behind
 * (docs/freshness.md).
 */
import { writesBetween } from '../deciders/version-bound.js'
import { CAS, type History, NO_VALUE, READ } from '../history/columns.js'
import { countPairs } from '../order/counting.js'
import { gatherKey, type KeyHistory, type KeyIndex } from '../order/key-history.js'
import { precedes } from '../order/precedence.js'
import { isRead, isWrite, readValue } from '../order/roles.js'
import { findVersions } from '../order/versions.js'
import { linearizable } from '../promises/linearizable.js'

/** One entry a read that could be judged; parallel arrays. */
export interface Samples {
  readonly count: number
  /** operation index of the read */
  readonly operation: Int32Array
  /** nanoseconds from the end of the newest write acked before it to its start; Infinity where there is none */
  readonly ageNs: Float64Array
  /** nanoseconds from the earliest end of a write that certainly overwrote what it returned to its start; 0: fresh */
  readonly staleNs: Float64Array
  /** how many acked writes certainly overwrote it */
  readonly behind: Int32Array
  /** 1 where a write had certainly overwritten what it returned */
  readonly isStale: Uint8Array
  readonly leftOut: LeftOut
}

/** Reads that could not be judged. */
export interface LeftOut {
  /** on keys with increments */
  readonly counters: number
  /** that could have seen one of several writes */
  readonly ambiguous: number
  /** of values that nobody wrote, or that precede their write */
  readonly wrong: number
}

/** Judges every read of the keys wanted. O(n log n), and the writes that a stale read is behind. */
export function takeSamples(
  history: History,
  index: KeyIndex,
  clockErrorNs: bigint,
  isWanted: (keyId: number) => boolean,
): Samples {
  const taker = new Taker(history.count)
  for (let keyId = 0; keyId + 1 < index.offset.length; keyId++) {
    if (index.offset[keyId] === index.offset[keyId + 1] || !isWanted(keyId)) continue
    taker.take(gatherKey(history, index, keyId, clockErrorNs))
  }
  return taker.samples()
}

class Taker {
  readonly #operation: Int32Array
  readonly #age: Float64Array
  readonly #stale: Float64Array
  readonly #behind: Int32Array
  readonly #isStale: Uint8Array
  #count = 0
  #counters = 0
  #ambiguous = 0
  #wrong = 0

  constructor(most: number) {
    this.#operation = new Int32Array(most)
    this.#age = new Float64Array(most)
    this.#stale = new Float64Array(most)
    this.#behind = new Int32Array(most)
    this.#isStale = new Uint8Array(most)
  }

  samples(): Samples {
    const n = this.#count
    return {
      count: n,
      operation: this.#operation.subarray(0, n),
      ageNs: this.#age.subarray(0, n),
      staleNs: this.#stale.subarray(0, n),
      behind: this.#behind.subarray(0, n),
      isStale: this.#isStale.subarray(0, n),
      leftOut: { counters: this.#counters, ambiguous: this.#ambiguous, wrong: this.#wrong },
    }
  }

  take(key: KeyHistory): void {
    const reads: number[] = []
    for (let p = 0; p < key.n; p++) if (isPlainRead(key, p)) reads.push(p)
    if (key.hasIncrements) {
      this.#counters += reads.length
      return
    }
    const counting = countPairs(key, linearizable)
    const versions = findVersions(key)
    const wrong = new Set(versions.wrongReads)
    const newest = new NewestBefore(key)
    const overwritten = firstOverwrites(key)
    for (const r of reads) {
      const version = versions.readOf[r]
      if (version < 0 && !wrong.has(r)) {
        this.#ambiguous++
        continue
      }
      if (wrong.has(r)) {
        this.#wrong++
        continue
      }
      const i = this.#count++
      const operation = key.operation[r]
      const { times } = key.history
      this.#operation[i] = operation
      const w = newest.of(r)
      this.#age[i] =
        w < 0 ? Number.POSITIVE_INFINITY : Number(times.startNs(operation) - times.endNs(key.operation[w]))
      const v = versions.writer[version]
      // By recorded time alone nothing can have overwritten it: then precedence says so, too.
      if (overwritten(v) > key.start[r]) continue
      const between = writesBetween(counting, v, r, Number.POSITIVE_INFINITY)
      if (between.length === 0) continue
      let first = between[0]
      for (const each of between) if (key.end[each] < key.end[first]) first = each
      this.#behind[i] = between.length
      this.#isStale[i] = 1
      this.#stale[i] = Number(times.startNs(operation) - times.endNs(key.operation[first]))
    }
  }
}

/** Reads, and failed cas that say what they saw. */
function isPlainRead(key: KeyHistory, p: number): boolean {
  if (!isRead(key, p)) return false
  return (
    key.kind[p] === READ || (key.kind[p] === CAS && key.applied[p] === 0 && readValue(key, p) !== NO_VALUE)
  )
}

/** The least recorded end of an acked write that starts no earlier than a write (-1: any) ended. */
function firstOverwrites(key: KeyHistory): (write: number) => number {
  const writes: number[] = []
  for (let p = 0; p < key.n; p++) if (key.acked[p] === 1 && isWrite(key, p)) writes.push(p)
  const least = new Float64Array(writes.length + 1).fill(Number.POSITIVE_INFINITY)
  for (let i = writes.length - 1; i >= 0; i--) least[i] = Math.min(least[i + 1], key.end[writes[i]])
  return (write) => {
    if (write < 0) return least[0]
    if (key.acked[write] === 0) return Number.POSITIVE_INFINITY
    let low = 0
    let high = writes.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (key.start[writes[middle]] < key.end[write]) low = middle + 1
      else high = middle
    }
    return least[low]
  }
}

/** Which acked write that certainly precedes a read ended last. */
class NewestBefore {
  readonly #key: KeyHistory
  /** acked writes by recorded end */
  readonly #byEnd: Int32Array

  constructor(key: KeyHistory) {
    this.#key = key
    const writes: number[] = []
    for (let p = 0; p < key.n; p++) if (key.acked[p] === 1 && isWrite(key, p)) writes.push(p)
    this.#byEnd = Int32Array.from(writes).sort((a, b) => key.end[a] - key.end[b] || a - b)
  }

  /** Local index, or -1. Looks at the writes that ended within the clock error before the read began. */
  of(read: number): number {
    const { start, end } = this.#key
    let low = 0
    let high = this.#byEnd.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (end[this.#byEnd[middle]] <= start[read]) low = middle + 1
      else high = middle
    }
    for (let at = low - 1; at >= 0; at--) {
      if (precedes(this.#key, this.#byEnd[at], read)) return this.#byEnd[at]
    }
    return -1
  }
}
