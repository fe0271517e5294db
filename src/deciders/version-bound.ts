/**
 * The `versions` bound of bounded-staleness: for each read r of a version with write v, at most k acked writes w
 * of the key have v ≺ w ≺ r (k-atomicity's question asked of precedence alone).
 */
import type { Counting } from '../order/counting.js'
import { precedes } from '../order/precedence.js'
import { isWrite } from '../order/roles.js'
import type { Versions } from '../order/versions.js'

/** Local writes w with v ≺ w ≺ read, the latest first, up to `most` of them. v = -1: the initial value. */
export function writesBetween({ key }: Counting, v: number, read: number, most: number): number[] {
  const between: number[] = []
  // v ≺ w implies that w stands after v in local order, and w ≺ r that it stands before r.
  for (let w = read - 1; w > v && between.length < most; w--) {
    if (key.acked[w] === 0 || !isWrite(key, w) || !precedes(key, w, read)) continue
    if (v < 0 || precedes(key, v, w)) between.push(w)
  }
  return between
}

/**
 * The reads that are more than `bound` versions behind, in local order. Costs the writes between a read and its
 * version, and stops at the first too many.
 */
export function readsTooFarBehind(counting: Counting, versions: Versions, bound: number): number[] {
  const { key } = counting
  const reads: number[] = []
  for (let r = 0; r < key.n; r++) {
    const version = versions.readOf[r]
    if (version < 0) continue
    if (writesBetween(counting, versions.writer[version], r, bound + 1).length > bound) reads.push(r)
  }
  return reads
}
