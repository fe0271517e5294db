/**
 * Which pairs `a ≺ b` each promise counts: the table of docs/promises.md, written out again.
 */
import type { Recorded } from './recorded.js'

type Which = 'none' | 'session' | 'late' | 'closing' | 'all'

/** A promise as a certificate's header names it. */
export interface Claimed {
  readonly name: string
  readonly promise: string
  readonly keys: string
  readonly withinNs?: string
  readonly settleNs?: string
  readonly versions?: number
}

export interface Row {
  readonly incrementIncrement: Which
  readonly writeRead: Which
  readonly readWrite: Which
  readonly readRead: Which
}

const NOTHING: Row = { incrementIncrement: 'none', writeRead: 'none', readWrite: 'none', readRead: 'none' }

const TABLE: Readonly<Record<string, Row>> = {
  'written-values': NOTHING,
  'monotonic-writes': NOTHING,
  'read-your-writes': { ...NOTHING, writeRead: 'session' },
  'monotonic-reads': { ...NOTHING, readRead: 'session' },
  'writes-follow-reads': { ...NOTHING, readWrite: 'session' },
  coherent: {
    incrementIncrement: 'session',
    writeRead: 'session',
    readWrite: 'session',
    readRead: 'session',
  },
  'bounded-staleness': { ...NOTHING, writeRead: 'late' },
  durable: { ...NOTHING, writeRead: 'closing' },
  regular: { incrementIncrement: 'all', writeRead: 'all', readWrite: 'all', readRead: 'none' },
  linearizable: { incrementIncrement: 'all', writeRead: 'all', readWrite: 'all', readRead: 'all' },
}

/** The row of a promise, undefined for one that pairs do not decide. */
export function rowOf({ promise, withinNs }: Claimed): Row | undefined {
  if (promise === 'bounded-staleness' && withinNs === undefined) return NOTHING
  return TABLE[promise]
}

export class Rules {
  readonly recorded: Recorded
  readonly claimed: Claimed
  readonly row: Row
  readonly #isCounter: boolean
  /** acked writes of the key */
  readonly #writes: readonly number[]
  /** the same, by their start; and by their end, the last first */
  #byStart: readonly number[] | undefined
  #byEnd: readonly number[] | undefined
  readonly #closing = new Map<number, boolean>()

  /** `operations`: all of the key's that count. */
  constructor(
    recorded: Recorded,
    claimed: Claimed,
    row: Row,
    operations: readonly number[],
    isCounter: boolean,
  ) {
    this.recorded = recorded
    this.claimed = claimed
    this.row = row
    this.#isCounter = isCounter
    this.#writes = operations.filter((i) => recorded.isAcked(i) && recorded.writes(i))
  }

  get withinNs(): bigint {
    return BigInt(this.claimed.withinNs ?? 0)
  }

  which(aWrites: boolean, bWrites: boolean): Which {
    const { incrementIncrement, writeRead, readWrite, readRead } = this.row
    if (aWrites) return bWrites ? (this.#isCounter ? incrementIncrement : 'all') : writeRead
    // Nobody reads the future: on a counter every read comes before the increments that it precedes.
    return bWrites ? (this.#isCounter ? 'all' : readWrite) : readRead
  }

  /** A read that every acked write of the key precedes, each having ended, certainly, `settle` before. */
  isClosing(b: number): boolean {
    let answer = this.#closing.get(b)
    if (answer === undefined) {
      const { recorded } = this
      const settle = BigInt(this.claimed.settleNs ?? 0)
      this.#byEnd ??= sorted(this.#writes, (w) => -recorded.end(w))
      answer = true
      for (const w of this.#byEnd) {
        // Those that ended earlier still are as certainly over on any clock.
        if (recorded.isSurelyEarlier(recorded.end(w) + settle, recorded.start(b))) break
        answer =
          recorded.precedes(w, b) && recorded.end(w) + settle + recorded.slack(w, b) <= recorded.start(b)
        if (!answer) break
      }
      this.#closing.set(b, answer)
    }
    return answer
  }

  /** Whether a must stand before b, in whatever roles the two have. */
  mustPrecede(a: number, b: number): boolean {
    const { recorded } = this
    if (a === b || !recorded.isAcked(a)) return false
    for (const aWrites of [true, false]) {
      if (!(aWrites ? recorded.writes(a) : recorded.reads(a))) continue
      for (const bWrites of [true, false]) {
        if (!(bWrites ? recorded.writes(b) : recorded.reads(b))) continue
        if (this.#counts(this.which(aWrites, bWrites), a, b)) return true
      }
    }
    return false
  }

  #counts(which: Which, a: number, b: number): boolean {
    const { recorded } = this
    switch (which) {
      case 'none':
        return false
      case 'session':
        return recorded.isAcked(a) && recorded.inSession(a, b)
      case 'late':
        return recorded.end(a) + this.withinNs + recorded.slack(a, b) < recorded.start(b)
      case 'closing':
        return this.isClosing(b) && recorded.precedes(a, b)
      case 'all':
        return recorded.precedes(a, b)
    }
  }

  /** Whether read r may have seen write w (-1: the start) as far as the bound on versions goes. */
  isFresh(w: number, r: number): boolean {
    const most = this.claimed.versions
    if (most === undefined) return true
    const { recorded } = this
    if (w >= 0 && !recorded.isAcked(w)) return true
    this.#byStart ??= sorted(this.#writes, (v) => recorded.start(v))
    let between = 0
    for (let at = countUpTo(this.#byStart, (v) => recorded.start(v), recorded.start(r)) - 1; at >= 0; at--) {
      const v = this.#byStart[at]
      if (w >= 0 && recorded.start(v) < recorded.end(w)) break
      if (v !== w && (w < 0 || recorded.precedes(w, v)) && recorded.precedes(v, r)) between++
      if (between > most) return false
    }
    return true
  }
}

function sorted(operations: readonly number[], by: (i: number) => bigint): number[] {
  return [...operations].sort((a, b) => (by(a) < by(b) ? -1 : by(a) > by(b) ? 1 : 0))
}

/** How many of sorted operations are at most at this time. */
function countUpTo(operations: readonly number[], by: (i: number) => bigint, time: bigint): number {
  let low = 0
  let high = operations.length
  while (low < high) {
    const middle = (low + high) >> 1
    if (by(operations[middle]) <= time) low = middle + 1
    else high = middle
  }
  return low
}
