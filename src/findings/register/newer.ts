/**
 * Which versions are newer than which (findings.md): w(V) ≺ w(W), or a sound read of V ≺ w(W), or W's cas found
 * V, or V is the initial version; chained.
 *
 * The direct pairs are interval orders again, so what is newer than a version is found by a search that skips
 * whole ranges of starts. A search stops at `REACH_LIMIT` versions: on keys where a read is staler than that,
 * chains that leave the nearest versions are not followed (the verdict never depends on it, only the choice
 * between kinds could).
 */
import type { Counting } from '../../order/counting.js'
import { counts } from '../../order/counting.js'
import type { IntervalOrder } from '../../order/interval-orders.js'
import { isRead } from '../../order/roles.js'
import { sortedPositions } from '../../order/sorting.js'
import { versionOrders } from '../../order/version-orders.js'
import type { Versions } from '../../order/versions.js'
import type { Link } from '../raw-finding.js'

const REACH_LIMIT = 4096

/** Operations of each version: `operations[offset[v] … offset[v + 1])`, local indices in local order. */
export interface Members {
  readonly offset: Int32Array
  readonly operations: Int32Array
}

/** The write of each version first, then its reads in local order. */
export function membersOf(counting: Counting, versions: Versions): Members {
  const { n } = counting.key
  const { count, readOf, writer } = versions
  const offset = new Int32Array(count + 1)
  for (let v = 0; v < count; v++) if (writer[v] >= 0) offset[v + 1]++
  for (let p = 0; p < n; p++) if (readOf[p] >= 0) offset[readOf[p] + 1]++
  for (let v = 0; v < count; v++) offset[v + 1] += offset[v]
  const next = offset.slice(0, count)
  const operations = new Int32Array(offset[count])
  for (let v = 0; v < count; v++) if (writer[v] >= 0) operations[next[v]++] = writer[v]
  for (let p = 0; p < n; p++) if (readOf[p] >= 0) operations[next[readOf[p]]++] = p
  return { offset, operations }
}

/** What is newer than one version, as far as a search went. */
export interface Reach {
  /** newer version → the version that the search came from */
  readonly from: ReadonlyMap<number, number>
}

export class Newer {
  readonly counting: Counting
  readonly versions: Versions
  readonly members: Members
  /** local index → 1 for a read that is not wrong by itself */
  readonly sound: Uint8Array
  /** the longest that a sound read took, in the key's own time */
  readonly longestRead: number
  /** version → 1 where its own cas is blamed, which then says nothing about order */
  readonly blamedCas: Uint8Array
  readonly #orders: SearchOrder[]
  /** version → versions whose cas found it */
  readonly #foundBy: Map<number, number[]>
  readonly #reaches = new Map<number, Reach>()

  constructor(counting: Counting, versions: Versions, blamedCas?: Uint8Array) {
    this.counting = counting
    this.versions = versions
    this.members = membersOf(counting, versions)
    const { n } = counting.key
    this.sound = new Uint8Array(n)
    const readOf = versions.readOf.slice()
    for (const p of versions.wrongReads) readOf[p] = -1
    let longest = 0
    for (let p = 0; p < n; p++) {
      if (readOf[p] < 0) continue
      this.sound[p] = 1
      longest = Math.max(longest, counting.key.end[p] - counting.key.start[p])
    }
    this.longestRead = longest
    this.blamedCas = blamedCas ?? new Uint8Array(versions.count).fill(1)
    const identity = Int32Array.from({ length: versions.count }, (_, v) => v)
    const writesOnly = versionOrders(counting, { ...versions, readOf }, identity, true)
    this.#orders = writesOnly.map((order) => new SearchOrder(order, versions.count))
    this.#foundBy = new Map()
    for (let v = 0; v < versions.count; v++) {
      const u = versions.found[v]
      if (u < 0) continue
      const others = this.#foundBy.get(u)
      if (others) others.push(v)
      else this.#foundBy.set(u, [v])
    }
  }

  /**
   * The versions newer than `version` whose write did not begin after the last read of `version` did (later ones prove
   * nothing), the nearest first, up to REACH_LIMIT of them.
   */
  reach(version: number): Reach {
    let reach = this.#reaches.get(version)
    if (!reach) {
      reach = this.#search(version, justAfter(this.#lastStart(version)))
      this.#reaches.set(version, reach)
    }
    return reach
  }

  /** When the first operation of a version began; -Infinity for the initial one. */
  beginOf(version: number): number {
    const { start } = this.counting.key
    const { offset, operations } = this.members
    if (version === 0) return Number.NEGATIVE_INFINITY
    let first = Number.POSITIVE_INFINITY
    for (let i = offset[version]; i < offset[version + 1]; i++) first = Math.min(first, start[operations[i]])
    return first
  }

  #lastStart(version: number): number {
    const { start } = this.counting.key
    const { offset, operations } = this.members
    let last = Number.NEGATIVE_INFINITY
    for (let i = offset[version]; i < offset[version + 1]; i++) last = Math.max(last, start[operations[i]])
    return last
  }

  /** The versions newer than `version` whose write began before `limit`. */
  #search(version: number, limit: number): Reach {
    const { found, writer, count } = this.versions
    const { start } = this.counting.key
    const from = new Map<number, number>()
    const queue = [version]
    /** the chain of cas that leads to the version being searched from: directly one after the other */
    const chain = new Set<number>()
    const visit = (w: number, origin: number): void => {
      if (w === version || w === 0 || chain.has(w) || from.has(w) || from.size >= REACH_LIMIT) return
      if (start[writer[w]] >= limit) return
      from.set(w, origin)
      queue.push(w)
    }
    // Per order, from which place on everything has been visited.
    const stops = this.#orders.map((order) => order.stopAt(limit))
    const searched = [...stops]
    const expanded = new Set<number>()
    for (let head = 0; head < queue.length && from.size < REACH_LIMIT; head++) {
      const origin = queue[head]
      chain.clear()
      // Whatever is newer than what V's own cas found is newer than V, unless that cas is itself blamed.
      for (let v = origin; v >= 0 && !expanded.has(v); v = this.blamedCas[v] ? -1 : found[v]) {
        expanded.add(v)
        chain.add(v)
        if (v === 0) {
          for (let w = 1; w < count && start[writer[w]] < limit && from.size < REACH_LIMIT; w++)
            visit(w, origin)
        }
        for (const w of this.#foundBy.get(v) ?? []) visit(w, origin)
        for (let o = 0; o < this.#orders.length; o++) {
          const order = this.#orders[o]
          const first = order.firstAfter(order.leastEndOf(v))
          // Along a chain its own members are passed over, so what was passed is not all visited.
          const isChain = v !== origin
          for (let i = first; i < (isChain ? stops[o] : searched[o]); i++) {
            if (from.size >= REACH_LIMIT) break
            visit(order.unitAt(i), origin)
          }
          if (!isChain && first < searched[o]) searched[o] = first
        }
      }
    }
    return { from }
  }

  /** The links that show `newer` to be newer than `version`, from the latter to the former. */
  path(version: number, newer: number): Link[] {
    let { from } = this.reach(version)
    if (!from.has(newer)) from = this.#search(version, Number.POSITIVE_INFINITY).from
    const steps: number[] = [newer]
    for (let v = newer; v !== version; ) {
      v = from.get(v) ?? version
      steps.push(v)
    }
    steps.reverse()
    return steps.slice(1).map((w, i) => this.#link(steps[i], w))
  }

  /** Whether W is newer than V. */
  isNewer(w: number, v: number): boolean {
    const [later, earlier] = [this.versions.writer[w], this.versions.writer[v]]
    if (later < 0 || v === w) return false
    if (earlier < 0 || counts(this.counting, earlier, 'write', later, 'write')) return true
    const began = this.counting.key.start[later]
    const reach = began <= this.#lastStart(v) ? this.reach(v) : this.#search(v, justAfter(began))
    return reach.from.has(w)
  }

  /** How much clock error a pair survives, in the key's own time; Infinity when no clock explains it. */
  pairSlack(before: number, after: number): number {
    const { key } = this.counting
    if (key.client[before] === key.client[after] || key.host[before] === key.host[after]) {
      return Number.POSITIVE_INFINITY
    }
    return key.start[after] - key.end[before]
  }

  /** The best direct link from version v to version w (or through what v's cas found). */
  #link(v: number, w: number): Link {
    const { found, writer } = this.versions
    for (let u = v; u >= 0; u = found[u]) {
      const link = this.#directLink(u, w)
      if (link) return link
      if (this.blamedCas[u]) break
    }
    return { type: 'initial', before: -1, after: writer[w] }
  }

  #directLink(v: number, w: number): Link | undefined {
    const { counting, versions, members, sound } = this
    const after = versions.writer[w]
    if (versions.found[w] === v) return { type: 'found', before: versions.writer[v], after }
    let best: Link | undefined
    let bestSlack = Number.NEGATIVE_INFINITY
    const end = Math.min(members.offset[v + 1], members.offset[v] + 256)
    for (let i = members.offset[v]; i < end; i++) {
      const before = members.operations[i]
      const isOwnWrite = versions.writeOf[before] === v
      if (!isOwnWrite && !(sound[before] && isRead(counting.key, before))) continue
      if (!counts(counting, before, isOwnWrite ? 'write' : 'read', after, 'write')) continue
      const link: Link = { type: 'pair', before, after }
      const slack = this.pairSlack(before, after)
      if (slack > bestSlack) {
        best = link
        bestSlack = slack
      }
    }
    if (!best && v === 0) return { type: 'initial', before: -1, after }
    return best
  }
}

/** An interval order of versions, searchable by start. */
class SearchOrder {
  readonly #order: IntervalOrder
  readonly #entryOf: Int32Array
  readonly #byStart: Int32Array

  constructor(order: IntervalOrder, versions: number) {
    this.#order = order
    this.#entryOf = new Int32Array(versions).fill(-1)
    for (let e = 0; e < order.unit.length; e++) this.#entryOf[order.unit[e]] = e
    this.#byStart = sortedPositions(order.maxStart)
  }

  leastEndOf(version: number): number {
    const e = this.#entryOf[version]
    return e < 0 ? Number.POSITIVE_INFINITY : this.#order.minEnd[e]
  }

  unitAt(i: number): number {
    return this.#order.unit[this.#byStart[i]]
  }

  /** Place of the first start at or after `time`; where the order tells places in a session, its end. */
  stopAt(time: number): number {
    return this.#order.inSession ? this.#byStart.length : this.#place((start) => start < time)
  }

  /** Place of the first start after `time`. */
  firstAfter(time: number): number {
    return this.#place((start) => start <= time)
  }

  #place(isBefore: (start: number) => boolean): number {
    const { maxStart } = this.#order
    let low = 0
    let high = this.#byStart.length
    while (low < high) {
      const middle = (low + high) >> 1
      if (isBefore(maxStart[this.#byStart[middle]])) low = middle + 1
      else high = middle
    }
    return low
  }
}

/** A limit that a start at `time` lies below and every later one does not. Times here are halves, and whole when large. */
function justAfter(time: number): number {
  return time + (Math.abs(time) < 2 ** 51 ? 0.25 : 1)
}
