/**
 * Chains of cas: a version written by a cas comes directly after the one it found, so a chain is ordered as one
 * block (semantics.md, "One engine").
 */
import type { Versions } from './versions.js'

export interface Blocks {
  readonly count: number
  /** version → block; blocks are numbered in order of their first version */
  readonly blockOf: Int32Array
  /** version → place in its chain, 0 for a plain write */
  readonly placeOf: Int32Array
  /** versions that two or more applied cas found, each once, in rising order */
  readonly foundTwice: readonly number[]
  /** a version whose chain of cas leads back to itself, or -1 */
  readonly circular: number
}

/** Joins versions into blocks. Where a version was found twice, both go on the block: it is broken anyway. O(versions). */
export function chainBlocks(versions: Versions): Blocks {
  const { count, found } = versions
  const blockOf = new Int32Array(count).fill(-1)
  const placeOf = new Int32Array(count)
  const children = new Int32Array(count)
  for (let v = 0; v < count; v++) if (found[v] >= 0) children[found[v]]++
  const foundTwice: number[] = []
  for (let v = 0; v < count; v++) if (children[v] > 1) foundTwice.push(v)

  let blocks = 0
  let circular = -1
  const path: number[] = []
  const walked = new Int32Array(count).fill(-1)
  for (let v = 0; v < count; v++) {
    let u = v
    path.length = 0
    while (blockOf[u] < 0 && walked[u] !== v) {
      walked[u] = v
      path.push(u)
      if (found[u] < 0) break
      u = found[u]
    }
    if (path.length === 0) continue
    const root = path[path.length - 1]
    if (blockOf[u] < 0) {
      // A plain write at the root, or a circle.
      if (found[root] >= 0 && circular < 0) circular = u
      blockOf[root] = blocks++
      path.pop()
    }
    for (let i = path.length - 1; i >= 0; i--) {
      const w = path[i]
      blockOf[w] = blockOf[found[w]]
      placeOf[w] = placeOf[found[w]] + 1
    }
  }
  return { count: blocks, blockOf, placeOf, foundTwice, circular }
}
