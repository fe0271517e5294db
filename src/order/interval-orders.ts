/**
 * Ordering units under several interval orders at once, without ever listing a pair.
 *
 * An interval order gives some of the units a `minEnd` and a `maxStart` on one clock and says: V must come
 * before W (V ≠ W) whenever minEnd(V) < maxStart(W). There may be thousands of such pairs a unit; a unit is
 * free to go as soon as its maxStart is at most the least minEnd of all other units left, so two sorted lists
 * and a pointer into each replace them. This is Kahn's topological sort (1962) on implicit edges:
 * O(entries · log entries).
 */

import { sortedPositions } from './sorting.js'

/** One clock's view. Entry arrays are parallel; a unit has at most one entry in an order. */
export interface IntervalOrder {
  /** true where the numbers are places in a session, not times */
  readonly inSession: boolean
  /** entry → unit */
  readonly unit: Int32Array
  /** entry → the end after which every later start of this order must wait for this unit; Infinity: never */
  readonly minEnd: Float64Array
  /** entry → the latest start in the unit; -Infinity: waits for nobody */
  readonly maxStart: Float64Array
}

export interface Sorted {
  /** units in an order that respects every pair, as far as one exists */
  readonly order: Int32Array
  /** units that could not be ordered: they lie on a cycle or behind one. Empty exactly when there is no cycle */
  readonly stuck: Int32Array
}

/** Sorts `units` units under all `orders`; `only`, where given, marks with 1 the units that take part. */
export function sortUnits(units: number, orders: readonly IntervalOrder[], only?: Uint8Array): Sorted {
  const clocks = orders.map((order) => new Clock(order, units))
  const taken = new Uint8Array(units)
  const blocked = new Int32Array(units)
  let left = 0
  for (let u = 0; u < units; u++) {
    if (only && only[u] === 0) taken[u] = 1
    else left++
  }
  const total = left
  for (const clock of clocks) {
    for (const u of clock.order.unit) blocked[u]++
  }

  const result = new Int32Array(left)
  let tail = 0
  const free = (unit: number): void => {
    if (--blocked[unit] === 0 && taken[unit] === 0) result[tail++] = unit
  }
  for (let u = 0; u < units; u++) {
    if (blocked[u] === 0 && taken[u] === 0) result[tail++] = u
  }
  for (const clock of clocks) clock.advance(taken, free)
  for (let head = 0; head < tail; head++) {
    const unit = result[head]
    taken[unit] = 1
    left--
    for (const clock of clocks) {
      if (clock.entryOf[unit] >= 0) clock.advance(taken, free)
    }
  }
  const stuck = new Int32Array(left)
  let s = 0
  for (let u = 0; u < units; u++) if (taken[u] === 0) stuck[s++] = u
  return { order: result.subarray(0, total - left), stuck }
}

/** Units that lie on a cycle or between two: stuck from the front and from the back. */
export function cyclicCore(units: number, orders: readonly IntervalOrder[]): Int32Array {
  const forward = sortUnits(units, orders)
  if (forward.stuck.length === 0) return forward.stuck
  const only = new Uint8Array(units)
  for (const u of forward.stuck) only[u] = 1
  const reversed = orders.map((o) => ({
    inSession: o.inSession,
    unit: o.unit,
    minEnd: o.maxStart.map((t) => -t),
    maxStart: o.minEnd.map((t) => -t),
  }))
  return sortUnits(units, reversed, only).stuck
}

/** One order with its two sorted lists and how far each has been worked off. */
class Clock {
  readonly order: IntervalOrder
  /** unit → its entry, or -1 */
  readonly entryOf: Int32Array
  readonly #byEnd: Int32Array
  readonly #byStart: Int32Array
  readonly #isFree: Uint8Array
  #first = 0
  #second = 1
  #nextStart = 0

  constructor(order: IntervalOrder, units: number) {
    this.order = order
    const m = order.unit.length
    this.entryOf = new Int32Array(units).fill(-1)
    for (let e = 0; e < m; e++) this.entryOf[order.unit[e]] = e
    this.#byEnd = sortedPositions(order.minEnd)
    this.#byStart = sortedPositions(order.maxStart)
    this.#isFree = new Uint8Array(m)
  }

  /** Frees every entry that no unit left in this order must precede any more. */
  advance(taken: Uint8Array, free: (unit: number) => void): void {
    const { unit, minEnd, maxStart } = this.order
    const m = unit.length
    const byEnd = this.#byEnd
    while (this.#first < m && taken[unit[byEnd[this.#first]]] === 1) this.#first++
    if (this.#second <= this.#first) this.#second = this.#first + 1
    while (this.#second < m && taken[unit[byEnd[this.#second]]] === 1) this.#second++
    const least = this.#first < m ? byEnd[this.#first] : -1
    const leastEnd = least >= 0 ? minEnd[least] : Number.POSITIVE_INFINITY
    const otherEnd = this.#second < m ? minEnd[byEnd[this.#second]] : Number.POSITIVE_INFINITY

    if (least >= 0 && this.#isFree[least] === 0 && maxStart[least] <= otherEnd) {
      this.#isFree[least] = 1
      free(unit[least])
    }
    while (this.#nextStart < m) {
      const e = this.#byStart[this.#nextStart]
      if (this.#isFree[e] === 0) {
        if (maxStart[e] > (e === least ? otherEnd : leastEnd)) break
        this.#isFree[e] = 1
        if (taken[unit[e]] === 0) free(unit[e])
      }
      this.#nextStart++
    }
  }
}
