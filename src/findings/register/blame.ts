/**
 * Which reads of a register key are blamed, and for what (findings.md): r of V is blamed when for some newer W
 * w(W) ≺ r (finished), or a sound read of W ≺ r (seen).
 */
import { counts } from '../../order/counting.js'
import { isWrite } from '../../order/roles.js'
import type { Newer } from './newer.js'

/** How far back a read looks for other reads; only reads staler than that many could be named differently. */
const LOOK_BACK = 20_000
/** How many newer versions are weighed as evidence for one read. */
const WEIGHED = 128

/** A newer version and the operation that proves it came before the read. Local indices. */
export interface Proof {
  readonly newer: number
  /** w(W), or a sound read of W */
  readonly via: number
  /** a read of W that an operation of V precedes and that precedes the blamed read: W is newer for that one only */
  readonly observedBy: number | undefined
}

export interface Blame {
  readonly read: number
  readonly version: number
  /** best proof of each sort, by how much clock error it survives */
  readonly finished: Proof | undefined
  readonly ownWrite: Proof | undefined
  readonly seen: Proof | undefined
  readonly ownRead: Proof | undefined
}

/** Local indices of each client's operations, in session order. */
export type Sessions = ReadonlyMap<number, readonly number[]>

export function sessionsOf(client: Int32Array): Sessions {
  const sessions = new Map<number, number[]>()
  for (let p = 0; p < client.length; p++) {
    const session = sessions.get(client[p])
    if (session) session.push(p)
    else sessions.set(client[p], [p])
  }
  return sessions
}

/** Blames one read, or undefined when nothing newer is known to come before it. */
export function blameRead(newer: Newer, sessions: Sessions, read: number): Blame | undefined {
  const version = newer.versions.readOf[read]
  if (version < 0) return undefined
  const weigh = new Weigher(newer, version, read)
  weighWrites(newer, version, read, weigh)
  weighOwnOperations(newer, version, read, sessions, weigh)
  weighReads(newer, version, read, weigh)
  const { finished, ownWrite, seen, ownRead } = weigh
  if (!finished && !seen) return undefined
  return { read, version, finished, ownWrite, seen, ownRead }
}

/** Keeps the best proof of each sort. */
class Weigher {
  finished: Proof | undefined
  ownWrite: Proof | undefined
  seen: Proof | undefined
  ownRead: Proof | undefined
  readonly #newer: Newer
  readonly #version: number
  readonly #read: number
  readonly #slack = new Map<Proof, number>()

  constructor(newer: Newer, version: number, read: number) {
    this.#newer = newer
    this.#version = version
    this.#read = read
  }

  add(proof: Proof, isWriteProof: boolean): void {
    const { key } = this.#newer.counting
    const own = key.client[proof.via] === key.client[this.#read]
    if (isWriteProof) {
      this.finished = this.#better(this.finished, proof)
      if (own) this.ownWrite = this.#better(this.ownWrite, proof)
    } else {
      this.seen = this.#better(this.seen, proof)
      if (own) this.ownRead = this.#better(this.ownRead, proof)
    }
  }

  #better(old: Proof | undefined, proof: Proof): Proof {
    return old && this.#slackOf(old) >= this.#slackOf(proof) ? old : proof
  }

  #slackOf(proof: Proof): number {
    let slack = this.#slack.get(proof)
    if (slack === undefined) {
      const { counting } = this.#newer
      slack = this.#newer.pairSlack(proof.via, this.#read)
      if (proof.observedBy !== undefined) {
        const q = proof.observedBy
        const first = observer(this.#newer, this.#version, q)
        slack = Math.min(slack, this.#newer.pairSlack(first, q), this.#newer.pairSlack(q, this.#read))
      } else {
        for (const link of this.#newer.path(this.#version, proof.newer)) {
          if (link.type === 'pair') slack = Math.min(slack, this.#newer.pairSlack(link.before, link.after))
        }
      }
      // Of equal ones the evidence with fewer operations: a write needs no read to show it.
      if (!isWrite(counting.key, proof.via)) slack -= 0.25
      this.#slack.set(proof, slack)
    }
    return slack
  }
}

function weighWrites(newer: Newer, version: number, read: number, weigh: Weigher): void {
  const { counting, versions } = newer
  const { key } = counting
  let weighed = 0
  for (const w of newer.reach(version).from.keys()) {
    const write = versions.writer[w]
    if (key.start[write] >= key.start[read] || !counts(counting, write, 'write', read, 'read')) continue
    weigh.add({ newer: w, via: write, observedBy: undefined }, true)
    if (++weighed >= WEIGHED) return
  }
}

function weighOwnOperations(
  newer: Newer,
  version: number,
  read: number,
  sessions: Sessions,
  weigh: Weigher,
): void {
  const { counting, versions, sound } = newer
  const { key } = counting
  const { from } = newer.reach(version)
  const session = sessions.get(key.client[read])!
  let weighed = 0
  const begin = newer.beginOf(version)
  for (let i = placeOf(session, read) - 1; i >= 0 && weighed < WEIGHED; i--) {
    const p = session[i]
    if (key.end[p] < begin) break
    const written = versions.writeOf[p]
    if (written > 0 && from.has(written) && counts(counting, p, 'write', read, 'read')) {
      weigh.add({ newer: written, via: p, observedBy: undefined }, true)
      weighed++
    }
    const seen = versions.readOf[p]
    if (seen > 0 && sound[p] && from.has(seen) && counts(counting, p, 'read', read, 'read')) {
      weigh.add({ newer: seen, via: p, observedBy: undefined }, false)
      weighed++
    }
  }
}

function weighReads(newer: Newer, version: number, read: number, weigh: Weigher): void {
  const { counting, versions, sound } = newer
  const { from } = newer.reach(version)
  const unordered = new Map<number, boolean>()
  let weighed = 0
  const { start } = counting.key
  const begin = newer.beginOf(version) - newer.longestRead
  const last = Math.max(0, read - LOOK_BACK)
  // What ended before the version began cannot have seen anything newer.
  for (let q = read - 1; q >= last && weighed < WEIGHED && start[q] >= begin; q--) {
    const w = versions.readOf[q]
    if (w < 0 || w === version || !sound[q] || !counts(counting, q, 'read', read, 'read')) continue
    if (from.has(w)) {
      weigh.add({ newer: w, via: q, observedBy: undefined }, false)
      weighed++
      continue
    }
    if (w === 0 || observer(newer, version, q) < 0) continue
    let isUnordered = unordered.get(w)
    if (isUnordered === undefined) {
      isUnordered = !newer.isNewer(version, w)
      unordered.set(w, isUnordered)
    }
    if (!isUnordered) continue
    weigh.add({ newer: w, via: q, observedBy: q }, false)
    weighed++
    const write = versions.writer[w]
    if (counts(counting, write, 'write', read, 'read'))
      weigh.add({ newer: w, via: write, observedBy: q }, true)
  }
}

/** An operation of the version that precedes read `q`, or -1. */
export function observer(newer: Newer, version: number, q: number): number {
  const { counting, versions, members, sound } = newer
  for (let i = members.offset[version]; i < members.offset[version + 1]; i++) {
    const p = members.operations[i]
    if (p >= q) {
      if (versions.writer[version] !== p) return -1
      continue
    }
    const isOwnWrite = versions.writer[version] === p
    if (!isOwnWrite && !sound[p]) continue
    if (counts(counting, p, isOwnWrite ? 'write' : 'read', q, 'read')) return p
  }
  return -1
}

function placeOf(session: readonly number[], p: number): number {
  let low = 0
  let high = session.length
  while (low < high) {
    const middle = (low + high) >> 1
    if (session[middle] < p) low = middle + 1
    else high = middle
  }
  return low
}
