/**
 * How fresh each read was: how long after the newest write before it, how long and how many writes behind
 * (docs/freshness.md).
 */
import { CAS, type History, NO_VALUE, READ } from '../history/columns.js'
import { gatherKey, type KeyHistory, type KeyIndex } from '../order/key-history.js'
import { isRead, readValue } from '../order/roles.js'
import { findVersions } from '../order/versions.js'
import { makeSpans, type Spans, setGap } from './spans.js'
import { WritesOfKey } from './writes-of-key.js'

/** One entry a read that could be judged; parallel arrays. */
export interface Samples {
  readonly count: number
  /** operation index of the read */
  readonly operation: Int32Array
  /** 1 where an acked write precedes it */
  readonly isAfterWrite: Uint8Array
  /** nanoseconds from the end of the newest write acked before it to its start; 0 where there is none */
  readonly ageNs: Spans
  /** nanoseconds from the earliest end of a write that certainly overwrote what it returned to its start; 0: fresh */
  readonly staleNs: Spans
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

/** Judges every read of the keys wanted. O(n log n), and the writes on a read's own clock within the clock error of it. */
export function takeSamples(
  history: History,
  index: KeyIndex,
  clockErrorNs: bigint,
  isWanted: (keyId: number) => boolean,
): Samples {
  const taker = new Taker(history)
  for (let keyId = 0; keyId + 1 < index.offset.length; keyId++) {
    if (index.offset[keyId] === index.offset[keyId + 1] || !isWanted(keyId)) continue
    taker.take(gatherKey(history, index, keyId, clockErrorNs))
  }
  return taker.samples()
}

class Taker {
  readonly #operation: Int32Array
  readonly #isAfterWrite: Uint8Array
  readonly #age: Spans
  readonly #stale: Spans
  readonly #behind: Int32Array
  readonly #isStale: Uint8Array
  #count = 0
  #counters = 0
  #ambiguous = 0
  #wrong = 0

  constructor({ count: most, times }: History) {
    this.#operation = new Int32Array(most)
    this.#isAfterWrite = new Uint8Array(most)
    this.#age = makeSpans(times, most)
    this.#stale = makeSpans(times, most)
    this.#behind = new Int32Array(most)
    this.#isStale = new Uint8Array(most)
  }

  samples(): Samples {
    const n = this.#count
    return {
      count: n,
      operation: this.#operation.subarray(0, n),
      isAfterWrite: this.#isAfterWrite.subarray(0, n),
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
    const versions = findVersions(key)
    const wrong = new Set(versions.wrongReads)
    const writes = new WritesOfKey(key)
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
      const { newest, overwriter, overwriters } = writes.before(r, versions.writer[version])
      if (newest >= 0) {
        this.#isAfterWrite[i] = 1
        setGap(this.#age, i, times, key.operation[newest], operation)
      }
      if (overwriter < 0) continue
      this.#behind[i] = overwriters
      this.#isStale[i] = 1
      setGap(this.#stale, i, times, key.operation[overwriter], operation)
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
