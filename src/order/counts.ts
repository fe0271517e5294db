/**
 * The counts on a counter key, exact, as numbers of increments since the start.
 *
 * With increments of one size d a count v is the level (v − initial) / d: how many increments it includes.
 * Levels are small whole numbers whatever the size of the counts, which are 64-bit and more.
 */
import { INCREMENT, NO_VALUE, NULL_VALUE, type Values } from '../history/columns.js'
import type { KeyHistory } from './key-history.js'
import { isRead } from './roles.js'

export interface Counts {
  /** what stands in the way of levels, if anything */
  readonly trouble: 'none' | 'no-number' | 'several-sizes' | 'impossible-count'
  /** the one size; 0n when every increment is of size 0 or there are none */
  readonly size: bigint
  /** local index → level that a reading operation returned, NaN where it does not read */
  readonly level: Float64Array
  /** the count at level 0 */
  readonly base: bigint
  /** false under `initialUnknown`: level 0 is then the lowest count read, not the start */
  readonly startKnown: boolean
}

/** The whole number that a read of a counter key returned: absence counts as 0; undefined when it is none. */
export function countOf(values: Values, id: number): bigint | undefined {
  return id === NULL_VALUE ? 0n : values.integer(id)
}

/** The size of local increment `p`. */
export function sizeOf(key: KeyHistory, values: Values, p: number): bigint {
  return values.integer(key.extra[p])!
}

/** Works out the levels of a counter key (increments and reads only). O(n log n). */
export function findCounts(key: KeyHistory, values: Values): Counts {
  const { n } = key
  const level = new Float64Array(n).fill(Number.NaN)
  const startKnown = key.initial !== NO_VALUE
  const none = { size: 0n, level, base: 0n, startKnown }

  let size: bigint | undefined
  let severalSizes = false
  let increments = 0
  let lowest: bigint | undefined
  let highest: bigint | undefined
  for (let p = 0; p < n; p++) {
    if (key.kind[p] === INCREMENT) {
      increments++
      const by = sizeOf(key, values, p)
      if (size === undefined) size = by
      else if (size !== by) severalSizes = true
    }
    if (!isRead(key, p)) continue
    const count = countOf(values, key.value[p])
    if (count === undefined) return { ...none, trouble: 'no-number' }
    if (lowest === undefined || count < lowest) lowest = count
    if (highest === undefined || count > highest) highest = count
  }
  const step = size ?? 0n
  const start = startKnown ? countOf(values, key.initial) : undefined
  if (startKnown && start === undefined) return { ...none, trouble: 'no-number' }
  const base = start ?? (step < 0n ? highest : lowest) ?? 0n
  if (severalSizes) return { ...none, trouble: 'several-sizes' }
  const found = { size: step, level, base, startKnown }
  for (let p = 0; p < n; p++) {
    if (!isRead(key, p)) continue
    const above = countOf(values, key.value[p])! - base
    if (step === 0n ? above !== 0n : above % step !== 0n) return { ...found, trouble: 'impossible-count' }
    const steps = step === 0n ? 0n : above / step
    if (steps < 0n || steps > BigInt(increments)) return { ...found, trouble: 'impossible-count' }
    level[p] = Number(steps)
  }
  return { ...found, trouble: 'none' }
}
