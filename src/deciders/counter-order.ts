/**
 * The sequence of a counter key with increments of one size: the slots between the counts read, filled earliest
 * deadline first as `decideCounter` does.
 */
import FlatQueue from 'flatqueue'
import { INCREMENT, type Values } from '../history/columns.js'
import type { Counting } from '../order/counting.js'
import { findCounts } from '../order/counts.js'
import { isRead } from '../order/roles.js'
import { findWindows } from './counter.js'

/**
 * Local indices in sequence order, undefined where the key is broken, `search` where this does not find one: sizes
 * differ or the start is not known. O(n log n).
 */
export function counterOrder(counting: Counting, values: Values): number[] | undefined | 'search' {
  const { key } = counting
  const counts = findCounts(key, values)
  if (counts.trouble === 'several-sizes') return 'search'
  if (counts.trouble !== 'none') return undefined
  // Where nothing changes the count, local order will do: it respects every pair.
  if (counts.size === 0n) return Array.from({ length: key.n }, (_, p) => p).filter((p) => key.acked[p] === 1)
  if (!counts.startKnown) return 'search'
  const windows = findWindows(counting, counts)
  if (!windows) return undefined
  const { after, last } = windows

  const readsAt = new Map<number, number[]>()
  const levels = new Set<number>([0])
  const increments: number[] = []
  for (let p = 0; p < key.n; p++) {
    if (key.kind[p] === INCREMENT) increments.push(p)
    if (!isRead(key, p)) continue
    levels.add(counts.level[p])
    if (key.kind[p] === INCREMENT) {
      levels.add(counts.level[p] - 1)
      continue
    }
    const others = readsAt.get(counts.level[p])
    if (others) others.push(p)
    else readsAt.set(counts.level[p], [p])
  }
  // Of equal deadlines the first in local order: whatever must come before an increment then does.
  const rank = new Int32Array(key.n)
  ;[...increments]
    .sort((a, b) => compare(last[a], last[b]) || a - b)
    .forEach((p, r) => {
      rank[p] = r
    })
  increments.sort((a, b) => compare(after[a], after[b]) || a - b)

  const order: number[] = []
  const waiting = new FlatQueue<number>()
  let next = 0
  let filled = 0
  for (const level of [...levels].sort((a, b) => a - b)) {
    const slots: number[] = []
    for (; filled < level; filled++) {
      const p = waiting.pop()
      if (p === undefined) return undefined
      slots.push(p)
    }
    order.push(...slots.sort((a, b) => a - b), ...(readsAt.get(level) ?? []))
    for (; next < increments.length && after[increments[next]] <= level; next++)
      waiting.push(increments[next], rank[increments[next]])
  }
  const placed = new Uint8Array(key.n)
  for (const p of order) placed[p] = 1
  const rest = increments.filter((p) => placed[p] === 0 && key.acked[p] === 1)
  return [...order, ...rest.sort((a, b) => a - b)]
}

function compare(a: number, b: number): number {
  return a < b ? -1 : a > b ? 1 : 0
}
