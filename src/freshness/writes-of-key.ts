/**
 * The acked writes of a key, asked read by read in local order: the newest before a read, and those that certainly
 * overwrote what it saw.
 */
import type { KeyHistory } from '../order/key-history.js'
import { precedes } from '../order/precedence.js'
import { isWrite } from '../order/roles.js'
import { sortedPositions } from '../order/sorting.js'

export interface Before {
  /** local index of the acked write before the read that ended last, or -1 */
  newest: number
  /** of the writes that certainly overwrote what was seen, the one that ended first, or -1 */
  overwriter: number
  overwriters: number
}

/** Acked writes on one clock or of one client: local indices by start, and by end. */
interface Members {
  readonly byStart: number[]
  byEnd: number[] | undefined
}

export class WritesOfKey {
  readonly #key: KeyHistory
  /** acked writes by start, and their starts */
  readonly #byStart: Int32Array
  readonly #starts: Float64Array
  /** place in `byStart` → the write from there on that ends first */
  readonly #firstToEnd: Int32Array
  /** places in `byStart`, by end */
  readonly #byEnd: Int32Array
  /** how many of `byEnd` were certainly over, on any clock, before the last read that was asked for */
  #over = 0
  /** binary indexed tree (Fenwick 1994) over places in `byStart`: those that are over */
  readonly #tree: Int32Array
  readonly #clients: Map<number, Members>
  readonly #hosts: Map<number, Members>
  /** local index → the last read that looked at this write by itself */
  readonly #lookedAt: Int32Array

  constructor(key: KeyHistory) {
    this.#key = key
    const writes: number[] = []
    let hasClockError = false
    for (let p = 0; p < key.n; p++) {
      if (key.acked[p] === 1 && isWrite(key, p)) {
        writes.push(p)
        if (key.sureEnd[p] !== key.end[p]) hasClockError = true
      }
    }
    const m = writes.length
    this.#byStart = Int32Array.from(writes)
    this.#starts = Float64Array.from(writes, (w) => key.start[w])
    this.#byEnd = sortedPositions(Float64Array.from(writes, (w) => key.end[w]))
    this.#firstToEnd = new Int32Array(m)
    for (let i = m - 1; i >= 0; i--) {
      const next = i + 1 < m ? this.#firstToEnd[i + 1] : -1
      this.#firstToEnd[i] = next >= 0 && key.end[next] < key.end[writes[i]] ? next : writes[i]
    }
    this.#tree = new Int32Array(m + 1)
    this.#clients = membersBy(key.client, writes)
    // Without a clock error hosts tell nothing that the times alone do not.
    this.#hosts = hasClockError ? membersBy(key.host, writes) : new Map()
    this.#lookedAt = new Int32Array(key.n).fill(-1)
  }

  /** About read `r`, which saw the write `seen` (-1: the initial value). Ask in rising order of `r`. */
  before(r: number, seen: number): Before {
    const key = this.#key
    this.#letEnd(key.start[r])
    const found: Before = {
      newest: this.#over > 0 ? this.#byStart[this.#byEnd[this.#over - 1]] : -1,
      overwriter: -1,
      overwriters: 0,
    }
    // An unsure write precedes nothing: no write certainly overwrote it.
    const canBeOverwritten = seen < 0 || key.acked[seen] === 1
    if (canBeOverwritten) this.#addSure(r, seen, found)
    this.#lookAtEnds(this.#clients.get(key.client[r]), r, seen, found)
    this.#lookAtEnds(this.#hosts.get(key.host[r]), r, seen, found)
    if (canBeOverwritten && seen >= 0) {
      this.#lookAtStarts(this.#clients.get(key.client[seen]), r, seen, found)
      this.#lookAtStarts(this.#hosts.get(key.host[seen]), r, seen, found)
    }
    return found
  }

  #letEnd(start: number): void {
    const { sureEnd } = this.#key
    const m = this.#byEnd.length
    for (; this.#over < m && sureEnd[this.#byStart[this.#byEnd[this.#over]]] < start; this.#over++) {
      for (let i = this.#byEnd[this.#over] + 1; i <= m; i += i & -i) this.#tree[i]++
    }
  }

  /** The writes that any clock places after `seen` and before `r`. */
  #addSure(r: number, seen: number, found: Before): void {
    const { sureEnd, start } = this.#key
    const from = seen < 0 ? 0 : firstAbove(this.#starts, sureEnd[seen])
    if (from >= this.#byStart.length) return
    const first = this.#firstToEnd[from]
    if (sureEnd[first] >= start[r]) return
    found.overwriter = first
    let earlier = 0
    for (let i = from; i > 0; i -= i & -i) earlier += this.#tree[i]
    found.overwriters = this.#over - earlier
  }

  /** Writes that only their own clock or session places before `r`. */
  #lookAtEnds(members: Members | undefined, r: number, seen: number, found: Before): void {
    if (!members) return
    const { end, sureEnd, start } = this.#key
    members.byEnd ??= [...members.byStart].sort((a, b) => end[a] - end[b] || a - b)
    const { byEnd } = members
    let at = firstWhere(byEnd, (w) => end[w] > start[r])
    while (--at >= 0 && sureEnd[byEnd[at]] >= start[r]) this.#look(byEnd[at], r, seen, found)
  }

  /** Writes that only their own clock or session places after `seen`. */
  #lookAtStarts(members: Members | undefined, r: number, seen: number, found: Before): void {
    if (!members) return
    const { end, sureEnd, start } = this.#key
    const { byStart } = members
    let at = firstWhere(byStart, (w) => start[w] >= end[seen])
    for (; at < byStart.length && start[byStart[at]] <= sureEnd[seen]; at++)
      this.#look(byStart[at], r, seen, found)
  }

  #look(w: number, r: number, seen: number, found: Before): void {
    if (this.#lookedAt[w] === r) return
    this.#lookedAt[w] = r
    const key = this.#key
    if (!precedes(key, w, r)) return
    if (found.newest < 0 || key.end[w] > key.end[found.newest]) found.newest = w
    if (seen >= 0 && !precedes(key, seen, w)) return
    // Counted already where any clock places it.
    if (key.sureEnd[w] < key.start[r] && (seen < 0 || key.sureEnd[seen] < key.start[w])) return
    found.overwriters++
    if (found.overwriter < 0 || key.end[w] < key.end[found.overwriter]) found.overwriter = w
  }
}

function membersBy(ids: Int32Array, writes: readonly number[]): Map<number, Members> {
  const groups = new Map<number, Members>()
  for (const w of writes) {
    const members = groups.get(ids[w])
    if (members) members.byStart.push(w)
    else groups.set(ids[w], { byStart: [w], byEnd: undefined })
  }
  return groups
}

/** The first place of an ascending array whose number is greater. */
function firstAbove(ascending: Float64Array, number: number): number {
  let low = 0
  let high = ascending.length
  while (low < high) {
    const middle = (low + high) >>> 1
    if (ascending[middle] > number) high = middle
    else low = middle + 1
  }
  return low
}

/** The first place from which on a test holds that holds from some place on. */
function firstWhere(list: readonly number[], test: (w: number) => boolean): number {
  let low = 0
  let high = list.length
  while (low < high) {
    const middle = (low + high) >>> 1
    if (test(list[middle])) high = middle
    else low = middle + 1
  }
  return low
}
