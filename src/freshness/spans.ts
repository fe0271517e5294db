/**
 * Spans of time, exact: whole nanoseconds in doubles where the recording's times fit them, else in 64 bits.
 */
import type { Times } from '../history/times.js'

export type Spans = Float64Array | BigUint64Array

/** Room for `n` spans between times of a history. */
export function makeSpans(times: Times, n: number): Spans {
  return times.startOffset && times.endOffset ? new Float64Array(n) : new BigUint64Array(n)
}

/** From the end of operation `a` to the start of operation `b`, which is not earlier, put in place `at`. */
export function setGap(spans: Spans, at: number, times: Times, a: number, b: number): void {
  if (spans instanceof Float64Array) spans[at] = times.startOffset![b] - times.endOffset![a]
  else spans[at] = times.startNs(b) - times.endNs(a)
}

/** The spans in the given places, ascending. O(n log n). */
export function sortedSpans(spans: Spans, places: Int32Array): Spans {
  if (spans instanceof Float64Array) {
    const some = new Float64Array(places.length)
    for (let i = 0; i < places.length; i++) some[i] = spans[places[i]]
    return some.sort()
  }
  const some = new BigUint64Array(places.length)
  for (let i = 0; i < places.length; i++) some[i] = spans[places[i]]
  return some.sort()
}
