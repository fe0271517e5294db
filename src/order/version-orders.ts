/**
 * The counted pairs between the versions of a key, as interval orders.
 *
 * A pair class (a in some roles, b in some roles, a scope) is on any one clock an interval order of the
 * versions: V → W exactly when the least end of V's a's lies before the greatest start of W's b's. Three kinds
 * of clock cover precedence: all operations by their certain ends, one host's by their recorded ends, one
 * client's by their place in its session.
 */
import type { PairRule, Role, Scope } from '../promises/promise.js'
import { type Counting, scopeOf } from './counting.js'
import { IndexMap } from './index-map.js'
import type { IntervalOrder } from './interval-orders.js'
import type { KeyHistory } from './key-history.js'
import { isRead } from './roles.js'
import type { Versions } from './versions.js'

const READS = 1
const WRITES = 2

interface PairClass {
  /** READS | WRITES: the roles of a, of b */
  a: number
  b: number
  scope: Scope
}

/** The classes that the rule counts on this key, those of one scope joined where that loses nothing. */
function pairClasses({ key, rule }: Counting, onlyBeforeWrites: boolean): PairClass[] {
  const classes: PairClass[] = []
  for (const ra of ['write', 'read'] as const satisfies readonly Role[]) {
    for (const rb of ['write', 'read'] as const satisfies readonly Role[]) {
      if (onlyBeforeWrites && rb === 'read') continue
      const scope = scopeOf(key, rule, ra, rb)
      if (scope === 'none') continue
      const a = ra === 'write' ? WRITES : READS
      const b = rb === 'write' ? WRITES : READS
      const same = classes.find((c) => c.scope === scope && c.a === a)
      if (same) same.b |= b
      else classes.push({ a, b, scope })
    }
  }
  for (let i = classes.length - 1; i > 0; i--) {
    const other = classes.findIndex((c, j) => j < i && c.scope === classes[i].scope && c.b === classes[i].b)
    if (other < 0) continue
    classes[other].a |= classes[i].a
    classes.splice(i, 1)
  }
  return classes
}

/**
 * The interval orders of the versions under the promise, with units as `unitOf` maps versions to them (blocks
 * of versions, or the identity); `onlyBeforeWrites`: only the pairs whose b is a write. O(n · classes).
 */
export function versionOrders(
  counting: Counting,
  versions: Versions,
  unitOf: Int32Array,
  onlyBeforeWrites = false,
): IntervalOrder[] {
  const { key } = counting
  const clocks = clocksOf(counting)
  const orders: IntervalOrder[] = []
  for (const pairs of pairClasses(counting, onlyBeforeWrites)) {
    const { scope } = pairs
    const all = new Int32Array(key.n)
    const closing = scope === 'closing' ? counting.closing : undefined
    const build = (members: Int32Array, end: Float64Array, start: Float64Array): void => {
      const inSession = start === clocks.place
      const order = buildOrder(counting, versions, unitOf, pairs, members, { end, start, inSession }, closing)
      if (order) orders.push(order)
    }
    if (scope !== 'session') {
      for (let p = 0; p < key.n; p++) all[p] = p
      const sure = scope === 'late' ? counting.delays!.sureEnd : key.sureEnd
      build(all, sure, key.start)
      const own = scope === 'late' ? counting.delays!.end : key.end
      for (const members of clocks.hosts) build(members, own, key.start)
      if (scope === 'late') {
        for (const members of clocks.clients) build(members, own, key.start)
        continue
      }
    }
    const sessions = scope === 'session' ? clocks.everyClient : clocks.clients
    for (const members of sessions) build(members, clocks.place, clocks.place)
  }
  return orders
}

/**
 * The version at whose place a reading operation stands. An applied cas stands where it wrote, directly after
 * the version that it found.
 */
export function placeOfRead(versions: Versions, p: number): number {
  return versions.writeOf[p] >= 0 ? versions.writeOf[p] : versions.readOf[p]
}

interface Clocks {
  /** local indices of each host that several clients share, where the clock error makes a difference */
  hosts: Int32Array[]
  /** local indices of each client whose session order adds pairs to the other clocks' */
  clients: Int32Array[]
  everyClient: Int32Array[]
  /** local index as a time: session order within a client */
  place: Float64Array
}

function clocksOf({ key, rule }: Counting): Clocks {
  const { n } = key
  let hasClockError = false
  for (let p = 0; p < n && !hasClockError; p++) hasClockError = key.sureEnd[p] !== key.end[p]
  const needsSessions = hasClockError || countsSessions(rule) || hasTies(key)
  if (!needsSessions) return { hosts: [], clients: [], everyClient: [], place: key.start }
  const byClient = groupBy(key.client)
  const everyClient = [...byClient.values()].filter((members) => members.length > 1)
  const touches = (members: Int32Array): boolean =>
    members.some((p, i) => i > 0 && key.end[members[i - 1]] === key.start[p])
  const clients = everyClient.filter((members) => hasClockError || touches(members))
  const hosts: Int32Array[] = []
  if (hasClockError) {
    for (const members of groupBy(key.host).values()) {
      if (members.some((p) => key.client[p] !== key.client[members[0]])) hosts.push(members)
    }
  }
  return { hosts, clients, everyClient, place: Float64Array.from({ length: n }, (_, p) => p) }
}

function countsSessions({ writeRead, readWrite, readRead }: PairRule): boolean {
  return writeRead === 'session' || readWrite === 'session' || readRead === 'session'
}

/** Whether some operation starts at the very time at which its client's last one ended. */
function hasTies({ n, client, start, end }: KeyHistory): boolean {
  const lastEnd = new Map<number, number>()
  for (let p = 0; p < n; p++) {
    if (lastEnd.get(client[p]) === start[p]) return true
    lastEnd.set(client[p], end[p])
  }
  return false
}

function groupBy(ids: Int32Array): Map<number, Int32Array> {
  const groups = new Map<number, number[]>()
  for (let p = 0; p < ids.length; p++) {
    const members = groups.get(ids[p])
    if (members) members.push(p)
    else groups.set(ids[p], [p])
  }
  return new Map([...groups].map(([id, members]) => [id, Int32Array.from(members)]))
}

/** One pair class on one clock, or undefined where it has no pair. */
function buildOrder(
  { key }: Counting,
  versions: Versions,
  unitOf: Int32Array,
  pairs: PairClass,
  members: Int32Array,
  { end, start, inSession }: { end: Float64Array; start: Float64Array; inSession: boolean },
  closing: Uint8Array | undefined,
): IntervalOrder | undefined {
  const entries = new Entries(Math.min(2 * members.length, unitOf.length), unitOf.length)
  const { writeOf } = versions
  for (let m = 0; m < members.length; m++) {
    const p = members[m]
    if (writeOf[p] >= 0) {
      const e = entries.of(unitOf[writeOf[p]])
      if ((pairs.a & WRITES) !== 0 && key.acked[p] === 1) entries.addEnd(e, end[p])
      if ((pairs.b & WRITES) !== 0) entries.addStart(e, start[p])
    }
    if (!isRead(key, p)) continue
    const place = placeOfRead(versions, p)
    if (place < 0) continue
    const e = entries.of(unitOf[place])
    if ((pairs.a & READS) !== 0) entries.addEnd(e, end[p])
    if ((pairs.b & READS) !== 0 && (closing === undefined || closing[p] === 1)) entries.addStart(e, start[p])
  }
  return entries.leastEnd < entries.greatestStart ? entries.toOrder(inSession) : undefined
}

/** Grows the entries of an order: a unit's is made when it is first met. */
class Entries {
  leastEnd = Number.POSITIVE_INFINITY
  greatestStart = Number.NEGATIVE_INFINITY
  #count = 0
  readonly #entryOf: IndexMap
  readonly #unit: Int32Array
  readonly #minEnd: Float64Array
  readonly #maxStart: Float64Array

  /** At most `most` entries of units below `units`. */
  constructor(most: number, units: number) {
    this.#entryOf = new IndexMap(units, most)
    this.#unit = new Int32Array(most)
    this.#minEnd = new Float64Array(most)
    this.#maxStart = new Float64Array(most)
  }

  of(unit: number): number {
    const known = this.#entryOf.get(unit)
    if (known >= 0) return known
    const e = this.#count++
    this.#entryOf.set(unit, e)
    this.#unit[e] = unit
    this.#minEnd[e] = Number.POSITIVE_INFINITY
    this.#maxStart[e] = Number.NEGATIVE_INFINITY
    return e
  }

  addEnd(e: number, end: number): void {
    if (end < this.#minEnd[e]) this.#minEnd[e] = end
    if (end < this.leastEnd) this.leastEnd = end
  }

  addStart(e: number, start: number): void {
    if (start > this.#maxStart[e]) this.#maxStart[e] = start
    if (start > this.greatestStart) this.greatestStart = start
  }

  toOrder(inSession: boolean): IntervalOrder {
    return {
      inSession,
      unit: this.#unit.subarray(0, this.#count),
      minEnd: this.#minEnd.subarray(0, this.#count),
      maxStart: this.#maxStart.subarray(0, this.#count),
    }
  }
}
