/**
 * Findings against the marks of the recording: what was being done to the store when, or just before, it went wrong.
 */
import type { History } from '../history/columns.js'

export interface MarkRelation {
  readonly mark: string
  readonly relation: 'during' | 'after'
  /** from the end of the mark to the start of the operation, in nanoseconds */
  readonly afterNs?: bigint
}

/** The marks that the operation overlaps; where there is none, the last one that ended before it. */
export function marksOf(history: History, operation: number): MarkRelation[] {
  const start = history.times.startNs(operation)
  const end = history.hasEnd[operation] ? history.times.endNs(operation) : start
  const during = history.marks.filter((mark) => mark.startNs <= end && mark.endNs >= start)
  if (during.length > 0) return during.map(({ text }) => ({ mark: text, relation: 'during' }))
  const before = history.marks.filter((mark) => mark.endNs < start)
  if (before.length === 0) return []
  const last = before.reduce((a, b) => (b.endNs >= a.endNs ? b : a))
  return [{ mark: last.text, relation: 'after', afterNs: start - last.endNs }]
}
