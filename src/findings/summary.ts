import { ACKED, CAS, DELETE, type History, INCREMENT, READ, REFUSED, WRITE } from '../history/columns.js'
import type { KeyIndex } from '../order/key-history.js'
import type { HistoryFacts } from './result.js'

/** The counts that open a result. O(operations). */
export function summarizeHistory(
  history: History,
  index: KeyIndex,
): Omit<HistoryFacts, 'clockErrorNs' | 'clockErrorFrom'> {
  const { count, kind, outcome } = history
  const kinds = new Float64Array(5)
  const outcomes = new Float64Array(3)
  for (let i = 0; i < count; i++) {
    kinds[kind[i]]++
    outcomes[outcome[i]]++
  }
  const span = timeSpan(history)
  let keys = 0
  for (let k = 0; k + 1 < index.offset.length; k++) if (index.offset[k] < index.offset[k + 1]) keys++
  return {
    ...(history.title === undefined ? {} : { title: history.title }),
    operations: count,
    reads: kinds[READ],
    writes: kinds[WRITE],
    increments: kinds[INCREMENT],
    cas: kinds[CAS],
    deletes: kinds[DELETE],
    acked: outcomes[ACKED],
    refused: outcomes[REFUSED],
    unsure: outcomes[2],
    clients: history.clients.size,
    hosts: history.hosts.size,
    keys,
    marks: history.marks.length,
    firstStart: span.first.toString(),
    lastEnd: span.last.toString(),
  }
}

/** Nanoseconds of the earliest start and the latest time of any operation. */
function timeSpan({ count, hasEnd, times }: History): { first: bigint; last: bigint } {
  const { startOffset, endOffset, baseNs } = times
  if (startOffset && endOffset) {
    let first = Number.POSITIVE_INFINITY
    let last = Number.NEGATIVE_INFINITY
    for (let i = 0; i < count; i++) {
      if (startOffset[i] < first) first = startOffset[i]
      const latest = hasEnd[i] ? endOffset[i] : startOffset[i]
      if (latest > last) last = latest
    }
    return count === 0
      ? { first: 0n, last: 0n }
      : { first: baseNs + BigInt(first), last: baseNs + BigInt(last) }
  }
  let first = times.startNs(0)
  let last = first
  for (let i = 0; i < count; i++) {
    const start = times.startNs(i)
    const latest = hasEnd[i] ? times.endNs(i) : start
    if (start < first) first = start
    if (latest > last) last = latest
  }
  return { first, last }
}
