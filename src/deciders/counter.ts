/**
 * Counter keys with increments of one size: fill the slots between the counts read (semantics.md, "Counters").
 *
 * The reads sorted by count cut the increments into segments that must be filled exactly. What counts gives
 * each increment a window: it must come after the greatest level read before it and not after the least level
 * read after it. A key holds exactly when the counts read do not run against each other, every increment that
 * has a last slot gets one, and every slot gets an increment. That the two can be had at once is the theorem of
 * Mendelsohn and Dulmage (1958); earliest-deadline first decides each (Jackson 1955).
 */
import FlatQueue from 'flatqueue'
import { INCREMENT, type Values } from '../history/columns.js'
import type { Counting } from '../order/counting.js'
import { type Counts, findCounts } from '../order/counts.js'
import { isRead } from '../order/roles.js'
import { GreatestBefore, LeastAfter } from '../order/sweeps.js'

export interface CounterOutcome {
  readonly verdict: 'holds' | 'broken' | 'several-sizes'
  readonly counts: Counts
}

/** Decides a counter key under the promise. O(n log n). */
export function decideCounter(counting: Counting, values: Values): CounterOutcome {
  const counts = findCounts(counting.key, values)
  if (counts.trouble === 'several-sizes') return { verdict: 'several-sizes', counts }
  if (counts.trouble !== 'none') return { verdict: 'broken', counts }
  if (counts.size === 0n) return { verdict: 'holds', counts }
  const windows = findWindows(counting, counts)
  const holds = windows !== undefined && slotsCanBeFilled(counting, counts, windows)
  return { verdict: holds ? 'holds' : 'broken', counts }
}

/** Per local index of an increment: it must be one of the increments number after + 1 … last. */
export interface Windows {
  /** -Infinity: may come before the lowest count read (start unknown) */
  readonly after: Float64Array
  /** Infinity: may come after every read, or not at all */
  readonly last: Float64Array
}

/** The windows of all increments, or undefined when two reads run against each other. O(n log n). */
export function findWindows(counting: Counting, counts: Counts): Windows | undefined {
  const { key, rule } = counting
  const { n } = key
  const lowest = counts.startKnown ? 0 : Number.NEGATIVE_INFINITY
  const after = new Float64Array(n).fill(Number.NEGATIVE_INFINITY)
  const last = new Float64Array(n).fill(Number.POSITIVE_INFINITY)
  const readLow = new Float64Array(n)
  const readHigh = new Float64Array(n)
  for (let p = 0; p < n; p++) {
    const reads = isRead(key, p)
    readLow[p] = reads ? counts.level[p] : Number.NEGATIVE_INFINITY
    readHigh[p] = reads ? counts.level[p] : Number.POSITIVE_INFINITY
  }

  const readsBeforeReads = new GreatestBefore(counting, rule.readRead, readLow)
  // Nobody reads the future: under every promise a read comes before the increments that it precedes.
  const readsBeforeIncrements = new GreatestBefore(counting, 'all', readLow)
  const incrementsBefore = new GreatestBefore(counting, rule.counterWriteWrite, after)
  for (let p = 0; p < n; p++) {
    const reads = isRead(key, p)
    if (reads && readsBeforeReads.at(p) > counts.level[p]) return undefined
    if (key.kind[p] !== INCREMENT) continue
    const own = reads ? counts.level[p] - 1 : lowest
    if (own < lowest) return undefined
    after[p] = Math.max(own, readsBeforeIncrements.at(p), incrementsBefore.at(p))
  }

  const readsAfter = new LeastAfter(counting, rule.writeRead, readHigh)
  const incrementsAfter = new LeastAfter(counting, rule.counterWriteWrite, last)
  for (const p of readsAfter.order) {
    if (key.kind[p] !== INCREMENT) continue
    const own = isRead(key, p) ? counts.level[p] : Number.POSITIVE_INFINITY
    last[p] = Math.min(own, readsAfter.at(p), incrementsAfter.at(p))
    if (last[p] <= after[p]) return undefined
  }
  return { after, last }
}

/** Levels at which the increments are cut: those read, and for a returned count the one before it too. */
function levelsOf(counting: Counting, counts: Counts): number[] {
  const { key } = counting
  const levels = new Set<number>()
  if (counts.startKnown) levels.add(0)
  for (let p = 0; p < key.n; p++) {
    if (!isRead(key, p)) continue
    levels.add(counts.level[p])
    if (key.kind[p] === INCREMENT) levels.add(counts.level[p] - 1)
  }
  return [...levels].sort((a, b) => a - b)
}

function slotsCanBeFilled(counting: Counting, counts: Counts, windows: Windows): boolean {
  const { key } = counting
  const { after, last } = windows
  const levels = levelsOf(counting, counts)
  const increments: number[] = []
  for (let p = 0; p < key.n; p++) if (key.kind[p] === INCREMENT) increments.push(p)
  increments.sort((a, b) => (after[a] < after[b] ? -1 : after[a] > after[b] ? 1 : a - b))
  // With the start unknown, what may come before the lowest read needs no slot.
  const needSlot = increments.filter((p) => last[p] !== Number.POSITIVE_INFINITY && after[p] >= levels[0])
  return everyoneIsPlaced(needSlot, levels, windows) && everySlotIsFilled(increments, levels, windows)
}

/** Whether all of these increments find a slot inside their windows, slots left empty as it may be. */
function everyoneIsPlaced(
  increments: readonly number[],
  levels: readonly number[],
  windows: Windows,
): boolean {
  const waiting = new FlatQueue<number>()
  let next = 0
  for (let s = 1; s < levels.length; s++) {
    while (next < increments.length && windows.after[increments[next]] <= levels[s - 1]) {
      waiting.push(increments[next], windows.last[increments[next]])
      next++
    }
    for (let slots = levels[s] - levels[s - 1]; slots > 0 && waiting.length > 0; slots--) waiting.pop()
    if (waiting.length > 0 && waiting.peekValue()! <= levels[s]) return false
  }
  return waiting.length === 0 && next === increments.length
}

/** Whether all slots can be filled, increments left over as it may be. */
function everySlotIsFilled(
  increments: readonly number[],
  levels: readonly number[],
  windows: Windows,
): boolean {
  const waiting = new FlatQueue<number>()
  let next = 0
  for (let s = 1; s < levels.length; s++) {
    while (next < increments.length && windows.after[increments[next]] <= levels[s - 1]) {
      waiting.push(increments[next], windows.last[increments[next]])
      next++
    }
    for (let slots = levels[s] - levels[s - 1]; slots > 0; slots--) {
      while (waiting.length > 0 && waiting.peekValue()! < levels[s]) waiting.pop()
      if (waiting.length === 0) return false
      waiting.pop()
    }
  }
  return true
}
