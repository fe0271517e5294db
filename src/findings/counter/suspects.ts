/**
 * Which reads of a counter key can be blamed at all: a quick test that lets through every read that the exact
 * pairwise bounds would blame, and few others.
 *
 * It replaces precedence by plain recorded time (a ≺ b implies that a's recorded end is at most b's start), which
 * makes least greater and most smaller. For increments of one size; counts are then small levels.
 */
import { INCREMENT } from '../../history/columns.js'
import type { KeyHistory } from '../../order/key-history.js'
import { isRead } from '../../order/roles.js'
import { RangeTree } from './range-tree.js'

/** Asked for each read in local order with the read to start from; answers whether to look at it exactly. */
export class Suspects {
  readonly #key: KeyHistory
  readonly #level: Float64Array
  /** reads by recorded end, and the place of each there */
  readonly #byEnd: Int32Array
  readonly #placeOf: Int32Array
  /** acked increments by recorded end */
  readonly #finished: Int32Array
  #nextFinished = 0
  /** place by end → level plus all increments surely later so far */
  readonly #least: RangeTree
  /** local index → minus (level − increments surely in it) */
  readonly #most: RangeTree
  /** starts of all increments, ascending */
  readonly #starts: Float64Array
  readonly #firstLevel: number
  /** levels that increments have returned so far */
  readonly #returned = new Set<number>()

  constructor(key: KeyHistory, level: Float64Array, startKnown: boolean) {
    this.#key = key
    this.#level = level
    this.#firstLevel = startKnown ? 0 : Number.NaN
    const reads: number[] = []
    const increments: number[] = []
    for (let p = 0; p < key.n; p++) {
      if (isRead(key, p)) reads.push(p)
      if (key.kind[p] === INCREMENT) increments.push(p)
    }
    const byEnd = (a: number, b: number): number =>
      key.end[a] < key.end[b] ? -1 : key.end[a] > key.end[b] ? 1 : a - b
    this.#byEnd = Int32Array.from(reads).sort(byEnd)
    this.#placeOf = new Int32Array(key.n).fill(-1)
    this.#byEnd.forEach((p, place) => {
      this.#placeOf[p] = place
    })
    this.#least = new RangeTree(Float64Array.from(this.#byEnd, (p) => level[p]))
    this.#finished = Int32Array.from(increments.filter((p) => key.acked[p] === 1)).sort(byEnd)
    this.#starts = Float64Array.from(increments, (p) => key.start[p]).sort()

    const ends = Float64Array.from(this.#finished, (p) => key.end[p])
    this.#most = new RangeTree(
      Float64Array.from({ length: key.n }, (_, p) =>
        isRead(key, p)
          ? countAtMost(ends, key.start[p]) - level[p] + (key.kind[p] === INCREMENT ? 1 : 0)
          : Number.NEGATIVE_INFINITY,
      ),
    )
  }

  /** Whether `read` may be blamed when counted from `from` (a read, or -1 for the start) on. */
  mayBeBlamed(read: number, from: number): boolean {
    const { start, end } = this.#key
    while (
      this.#nextFinished < this.#finished.length &&
      end[this.#finished[this.#nextFinished]] <= start[read]
    ) {
      const i = this.#finished[this.#nextFinished++]
      this.#least.addBefore(this.#readsEndedBy(start[i]), 1)
    }
    const level = this.#level[read]
    const own = this.#key.kind[read] === INCREMENT ? 1 : 0
    const first = from < 0 ? 0 : this.#placeOf[from]
    if (level < this.#least.greatest(first, this.#readsEndedBy(start[read])) + own) return true
    if (own === 1) {
      // Two returned counts that are the same need not follow each other.
      if (this.#returned.has(level)) return true
      this.#returned.add(level)
    }
    const begun = countBelow(this.#starts, end[read])
    if (level > begun - this.#most.greatest(Math.max(from, 0), read)) return true
    if (from >= 0 || Number.isNaN(this.#firstLevel)) return false
    const done = this.#nextFinished
    return level < done + own || level > begun
  }

  #readsEndedBy(time: number): number {
    let low = 0
    let high = this.#byEnd.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (this.#key.end[this.#byEnd[middle]] <= time) low = middle + 1
      else high = middle
    }
    return low
  }
}

function countAtMost(sorted: Float64Array, time: number): number {
  let low = 0
  let high = sorted.length
  while (low < high) {
    const middle = (low + high) >> 1
    if (sorted[middle] <= time) low = middle + 1
    else high = middle
  }
  return low
}

function countBelow(sorted: Float64Array, time: number): number {
  let low = 0
  let high = sorted.length
  while (low < high) {
    const middle = (low + high) >> 1
    if (sorted[middle] < time) low = middle + 1
    else high = middle
  }
  return low
}
