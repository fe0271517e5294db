/**
 * Which reads of a register key can be blamed at all: a quick test that lets through every read that the exact rules
 * would blame, and few others.
 *
 * It replaces precedence by plain recorded time (a ≺ b implies that a's recorded end is at most b's start). A read r of V
 * can only be blamed when a write that began after some operation of V ended, or a read of its version, ended before
 * r began; or when some read of another version lies between an operation of V and r.
 */
import { isRead } from '../../order/roles.js'
import type { Newer } from './newer.js'

export class Sift {
  readonly #newer: Newer
  /** false where chains of cas or the clock error could lead around the test */
  readonly #isApplicable: boolean
  readonly #firstEnd: Float64Array
  readonly #writes: EarliestEnd
  readonly #reads: EarliestEnd

  constructor(newer: Newer) {
    this.#newer = newer
    const { versions, counting, sound } = newer
    const { key } = counting
    const hasCas = versions.found.some((v) => v >= 0)
    const hasClockError = key.sureEnd.some((end, p) => end !== key.end[p])
    this.#isApplicable = !hasCas && !hasClockError
    this.#firstEnd = new Float64Array(versions.count).fill(Number.POSITIVE_INFINITY)
    if (!this.#isApplicable) {
      this.#writes = new EarliestEnd([])
      this.#reads = this.#writes
      return
    }
    const reads: Stretch[] = []
    for (let p = 0; p < key.n; p++) {
      const seen = versions.readOf[p]
      const written = versions.writeOf[p]
      const lower = (version: number): void => {
        if (key.end[p] < this.#firstEnd[version]) this.#firstEnd[version] = key.end[p]
      }
      if (written > 0 && key.acked[p] === 1) lower(written)
      if (seen >= 0 && sound[p] && isRead(key, p)) {
        lower(seen)
        reads.push({ start: key.start[p], end: key.end[p], version: seen })
      }
    }
    this.#firstEnd[0] = Number.NEGATIVE_INFINITY
    const writes: Stretch[] = []
    for (let v = 1; v < versions.count; v++) {
      writes.push({ start: key.start[versions.writer[v]], end: this.#firstEnd[v], version: v })
    }
    this.#writes = new EarliestEnd(writes)
    this.#reads = new EarliestEnd(reads)
  }

  /** Whether the read has to be looked at. O(log n). */
  mayBeBlamed(read: number): boolean {
    if (!this.#isApplicable) return true
    const version = this.#newer.versions.readOf[read]
    const since = this.#firstEnd[version]
    const before = this.#newer.counting.key.start[read]
    return this.#writes.since(since, version) <= before || this.#reads.since(since, version) <= before
  }
}

interface Stretch {
  readonly start: number
  readonly end: number
  readonly version: number
}

/** Stretches by start, with the earliest end from each on, of all versions and of all but the earliest one's. */
class EarliestEnd {
  readonly #start: Float64Array
  readonly #first: Float64Array
  readonly #firstVersion: Int32Array
  readonly #second: Float64Array

  constructor(stretches: Stretch[]) {
    stretches.sort((a, b) => a.start - b.start)
    const n = stretches.length
    this.#start = Float64Array.from(stretches, ({ start }) => start)
    this.#first = new Float64Array(n + 1).fill(Number.POSITIVE_INFINITY)
    this.#second = new Float64Array(n + 1).fill(Number.POSITIVE_INFINITY)
    this.#firstVersion = new Int32Array(n + 1).fill(-1)
    for (let i = n - 1; i >= 0; i--) {
      const { end, version } = stretches[i]
      const [first, owner, second] = [this.#first[i + 1], this.#firstVersion[i + 1], this.#second[i + 1]]
      if (end < first) {
        this.#first[i] = end
        this.#firstVersion[i] = version
        this.#second[i] = owner === version ? second : first
      } else {
        this.#first[i] = first
        this.#firstVersion[i] = owner
        this.#second[i] = owner === version ? second : Math.min(second, end)
      }
    }
  }

  /** The earliest end among stretches that begin at `time` or later and are not this version's. */
  since(time: number, version: number): number {
    let low = 0
    let high = this.#start.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (this.#start[middle] < time) low = middle + 1
      else high = middle
    }
    return this.#firstVersion[low] === version ? this.#second[low] : this.#first[low]
  }
}
