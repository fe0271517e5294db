/**
 * Ends with a waiting time added, for the promises that give the store some time (bounded staleness, durable).
 */
import type { KeyHistory } from './key-history.js'

/** Per local index, comparable with `KeyHistory.start` exactly as the recorded nanoseconds are. */
export interface DelayedEnds {
  /** end + delay */
  readonly end: Float64Array
  /** end + delay + 2·clockError */
  readonly sureEnd: Float64Array
}

/** Adds `delayNs` to the ends of a gathered key. O(n), or O(n log n) where times do not fit a double. */
export function delayEnds(key: KeyHistory, delayNs: bigint): DelayedEnds {
  const { n, history, clockErrorNs } = key
  const { startOffset, endOffset } = history.times
  const uncertainty = 2n * clockErrorNs
  const narrow =
    startOffset !== undefined &&
    endOffset !== undefined &&
    delayNs + uncertainty <= 2n ** 52n &&
    uncertainty <= 2n ** 52n
  if (narrow) {
    const delay = Number(delayNs)
    return { end: key.end.map((t) => t + delay), sureEnd: key.sureEnd.map((t) => t + delay) }
  }
  // Starts are ranks here, or a sum no longer fits: place each shifted end among the starts.
  const startsNs = Array.from(key.operation, (i) => history.times.startNs(i))
  const byTime = Array.from(startsNs.keys()).sort((a, b) =>
    startsNs[a] < startsNs[b] ? -1 : startsNs[a] > startsNs[b] ? 1 : 0,
  )
  const place = (ns: bigint): number => {
    let low = 0
    let high = n
    while (low < high) {
      const middle = (low + high) >> 1
      if (startsNs[byTime[middle]] < ns) low = middle + 1
      else high = middle
    }
    // Strictly between the last start before it and the first at or after it; equal to that one when equal.
    if (low === n) return Number.POSITIVE_INFINITY
    const at = byTime[low]
    return startsNs[at] === ns ? key.start[at] : key.start[at] - 0.5
  }
  const shifted = (extra: bigint): Float64Array =>
    Float64Array.from(key.operation, (i, p) =>
      key.end[p] === Number.POSITIVE_INFINITY
        ? Number.POSITIVE_INFINITY
        : place(history.times.endNs(i) + extra),
    )
  return { end: shifted(delayNs), sureEnd: shifted(delayNs + uncertainty) }
}
