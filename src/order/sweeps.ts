/**
 * For every operation the extreme of a number over the operations that count as before, or as after it, without
 * listing pairs: sweeps over the clocks of precedence. Each sweep takes O(n log n) for the whole key.
 */
import type { Scope } from '../promises/promise.js'
import type { Counting } from './counting.js'

interface Lists {
  /** local indices by rising certain end (or start), those of all operations, then those of each host */
  all: Int32Array
  byHost: Map<number, Int32Array>
}

/** The ends that a scope compares with starts. */
function endsOf(counting: Counting, scope: Scope): { sure: Float64Array; own: Float64Array } {
  if (scope === 'late') return { sure: counting.delays!.sureEnd, own: counting.delays!.end }
  return { sure: counting.key.sureEnd, own: counting.key.end }
}

/**
 * The greatest `level` among the acked operations that count as before an operation. `level` may still change
 * for an operation until the sweep has passed it; -Infinity means that it takes no part.
 */
export class GreatestBefore {
  readonly #counting: Counting
  readonly #scope: Scope
  readonly #level: Float64Array
  readonly #sure: Float64Array
  readonly #own: Float64Array
  readonly #lists: Lists
  #next = 0
  #greatest = Number.NEGATIVE_INFINITY
  readonly #hosts = new Map<number, { next: number; greatest: number }>()
  readonly #clients = new Map<number, number>()
  #passed = 0

  constructor(counting: Counting, scope: Scope, level: Float64Array) {
    this.#counting = counting
    this.#scope = scope
    this.#level = level
    const { sure, own } = endsOf(counting, scope)
    this.#sure = sure
    this.#own = own
    this.#lists = sortedLists(counting, (a, b) => own[a] - own[b] || a - b)
  }

  /** The greatest level before local operation `b`. Ask in rising order of `b`. */
  at(b: number): number {
    const { key } = this.#counting
    const scope = this.#scope
    if (scope === 'none' || (scope === 'closing' && this.#counting.closing![b] === 0))
      return Number.NEGATIVE_INFINITY
    this.#passClients(b)
    let greatest = Number.NEGATIVE_INFINITY
    if (scope !== 'session') {
      const start = key.start[b]
      const { all, byHost } = this.#lists
      while (this.#next < all.length && this.#sure[all[this.#next]] < start) {
        this.#greatest = this.#max(this.#greatest, all[this.#next++])
      }
      greatest = this.#greatest
      const members = byHost.get(key.host[b])
      if (members) {
        const host = this.#hosts.get(key.host[b]) ?? { next: 0, greatest: Number.NEGATIVE_INFINITY }
        this.#hosts.set(key.host[b], host)
        while (host.next < members.length && this.#own[members[host.next]] < start) {
          host.greatest = this.#max(host.greatest, members[host.next++])
        }
        if (host.greatest > greatest) greatest = host.greatest
      }
    }
    if (scope !== 'late') {
      const session = this.#clients.get(key.client[b])
      if (session !== undefined && session > greatest) greatest = session
    }
    return greatest
  }

  #passClients(b: number): void {
    const { client } = this.#counting.key
    for (; this.#passed < b; this.#passed++) {
      const c = client[this.#passed]
      this.#clients.set(c, this.#max(this.#clients.get(c) ?? Number.NEGATIVE_INFINITY, this.#passed))
    }
  }

  #max(greatest: number, a: number): number {
    return this.#counting.key.acked[a] === 1 && this.#level[a] > greatest ? this.#level[a] : greatest
  }
}

/**
 * The least `level` among the operations that count as after an acked one. `level` may still change for an
 * operation until the sweep has passed it; Infinity means that it takes no part.
 */
export class LeastAfter {
  readonly #counting: Counting
  readonly #scope: Scope
  readonly #level: Float64Array
  readonly #sure: Float64Array
  readonly #own: Float64Array
  readonly #lists: Lists
  #next: number
  #least = Number.POSITIVE_INFINITY
  readonly #hosts = new Map<number, { next: number; least: number }>()
  readonly #clients = new Map<number, number>()
  readonly #order: Int32Array
  #passed: number

  constructor(counting: Counting, scope: Scope, level: Float64Array) {
    this.#counting = counting
    this.#scope = scope
    this.#level = level
    const { sure, own } = endsOf(counting, scope)
    this.#sure = sure
    this.#own = own
    const { start } = counting.key
    this.#lists = sortedLists(counting, (a, b) => start[a] - start[b] || a - b)
    this.#next = this.#lists.all.length - 1
    this.#order = reverseOrder(counting)
    this.#passed = 0
  }

  /** The order in which to ask: a linear extension of precedence, backward. */
  get order(): Int32Array {
    return this.#order
  }

  /** The least level after local operation `a`. Ask in the order of `order`. */
  at(a: number): number {
    const { key } = this.#counting
    const scope = this.#scope
    if (scope === 'none' || key.acked[a] === 0) return Number.POSITIVE_INFINITY
    this.#passClients(a)
    let least = Number.POSITIVE_INFINITY
    if (scope !== 'session') {
      const { all, byHost } = this.#lists
      while (this.#next >= 0 && key.start[all[this.#next]] > this.#sure[a]) {
        this.#least = this.#min(this.#least, all[this.#next--])
      }
      least = this.#least
      const members = byHost.get(key.host[a])
      if (members) {
        const host = this.#hosts.get(key.host[a]) ?? {
          next: members.length - 1,
          least: Number.POSITIVE_INFINITY,
        }
        this.#hosts.set(key.host[a], host)
        while (host.next >= 0 && key.start[members[host.next]] > this.#own[a]) {
          host.least = this.#min(host.least, members[host.next--])
        }
        if (host.least < least) least = host.least
      }
    }
    if (scope !== 'late') {
      const session = this.#clients.get(key.client[a])
      if (session !== undefined && session < least) least = session
    }
    return least
  }

  #passClients(a: number): void {
    const { client } = this.#counting.key
    while (this.#order[this.#passed] !== a) {
      const p = this.#order[this.#passed++]
      this.#clients.set(client[p], this.#min(this.#clients.get(client[p]) ?? Number.POSITIVE_INFINITY, p))
    }
  }

  #min(least: number, b: number): number {
    if (this.#scope === 'closing' && this.#counting.closing![b] === 0) return least
    return Math.min(this.#level[b], least)
  }
}

/** Local indices by falling end: with `i ≺ j`, j comes first. */
function reverseOrder({ key }: Counting): Int32Array {
  const order = Int32Array.from({ length: key.n }, (_, p) => p)
  // Infinity - Infinity is NaN, so ends are compared, not subtracted.
  return order.sort((a, b) => (key.end[a] > key.end[b] ? -1 : key.end[a] < key.end[b] ? 1 : b - a))
}

/** All operations, and those of each clock that several operations share (one client's counts as a clock). */
function sortedLists({ key }: Counting, compare: (a: number, b: number) => number): Lists {
  const all = Int32Array.from({ length: key.n }, (_, p) => p).sort((a, b) => compare(a, b) || a - b)
  const members = new Map<number, number[]>()
  for (const p of all) {
    const list = members.get(key.host[p])
    if (list) list.push(p)
    else members.set(key.host[p], [p])
  }
  return { all, byHost: new Map([...members].map(([host, list]) => [host, Int32Array.from(list)])) }
}
