/**
 * Lost writes (findings.md): an acked write after which at least two reads return older versions, one of them
 * a closing read, and no read that one of them precedes returns it or anything newer.
 */
import { closingReads, counts } from '../../order/counting.js'
import { precedes } from '../../order/precedence.js'
import type { Blame } from './blame.js'
import type { Newer } from './newer.js'

/** How many older lost writes are looked for behind a newest one. */
const NAMED = 1000

export interface LostWrite {
  /** the newest lost version */
  readonly version: number
  /** older versions that the same reads prove lost, newest first */
  readonly older: readonly number[]
  /** local indices of the reads of older versions after it, in local order */
  readonly reads: readonly number[]
  /** the first closing read among them */
  readonly closing: number
}

/** The newest lost writes of a key, each with the reads that prove it. */
export function findLostWrites(newer: Newer, blames: readonly Blame[]): LostWrite[] {
  const closing = newer.counting.closing ?? closingReads(newer.counting.key)
  const candidates = new Set<number>()
  const { versions, counting } = newer
  const { key } = counting
  for (const { read, version, finished } of blames) {
    if (!finished || closing[read] === 0) continue
    for (const w of newer.reach(version).from.keys()) {
      const write = versions.writer[w]
      if (key.acked[write] === 1 && counts(counting, write, 'write', read, 'read')) candidates.add(w)
    }
  }
  // Later writes first, so that the newest lost one is met before those it overwrote.
  const byTime = [...candidates].sort(
    (a, b) => key.start[versions.writer[b]] - key.start[versions.writer[a]] || b - a,
  )
  const lost: { version: number; older: number[]; reads: Set<number>; closing: number }[] = []
  for (const w of byTime) {
    const behind = lost.find((known) => isNewerThan(newer, known.version, w))
    if (behind && behind.older.length >= NAMED) continue
    const reads = readsWithout(newer, w, closing)
    if (!reads) continue
    if (behind) {
      behind.older.push(w)
      for (const read of reads) behind.reads.add(read)
    } else {
      lost.push({
        version: w,
        older: [],
        reads: new Set(reads),
        closing: reads.find((r) => closing[r] === 1)!,
      })
    }
  }
  return lost.map((l) => ({ ...l, reads: [...l.reads].sort((a, b) => a - b) }))
}

/** The reads of versions older than `w` after its write, when they prove it lost. */
function readsWithout(newer: Newer, w: number, closing: Uint8Array): number[] | undefined {
  const { versions, sound, counting } = newer
  const { key } = counting
  const write = versions.writer[w]
  const reads: number[] = []
  let hasClosing = false
  for (let p = write + 1; p < key.n; p++) {
    const x = versions.readOf[p]
    if (x < 0 || !sound[p]) continue
    if (x === w || isNewerThan(newer, x, w)) {
      if (reads.some((r) => precedes(key, r, p))) return undefined
    } else if (counts(counting, write, 'write', p, 'read') && isNewerThan(newer, w, x)) {
      reads.push(p)
      if (closing[p] === 1) hasClosing = true
    }
  }
  return hasClosing && reads.length >= 2 ? reads : undefined
}

function isNewerThan(newer: Newer, w: number, v: number): boolean {
  const { versions, counting } = newer
  if (w === v || w === 0) return false
  if (v === 0) return true
  return counts(counting, versions.writer[v], 'write', versions.writer[w], 'write') || newer.isNewer(w, v)
}
