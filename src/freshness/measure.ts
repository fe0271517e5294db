/**
 * Measures how fresh the reads of a history were: all of them, and by key, client or mark.
 */
import type { History } from '../history/columns.js'
import { indexByKey } from '../order/key-history.js'
import { keyGlob } from '../promises/glob.js'
import { type Freshness, type FreshnessGroup, sumUp } from './figures.js'
import { type Samples, takeSamples } from './samples.js'

export type GroupBy = 'key' | 'client' | 'mark'

export interface FreshnessRequest {
  /** replaces what the headers say, in nanoseconds */
  readonly clockErrorNs?: bigint
  /** globs: only keys that match one; with `by` "key" a group each */
  readonly keys?: readonly string[]
  readonly by?: GroupBy
}

/** What was measured; version of the program and format are the caller's to add. */
export function measureFreshness(
  history: History,
  request: FreshnessRequest = {},
): Omit<Freshness, 'freshness' | 'misread'> {
  const clockErrorNs = request.clockErrorNs ?? history.clockErrorNs
  const wanted = request.keys?.map(keyGlob)
  const samples = takeSamples(history, indexByKey(history), clockErrorNs, (keyId) => {
    const name = history.keys.name(keyId)
    return !wanted || wanted.some((matches) => matches(name))
  })
  const all = Int32Array.from({ length: samples.count }, (_, i) => i)
  return {
    inputs: history.files.map(({ name, bytes }) => ({ file: name, bytes })),
    clockErrorNs: clockErrorNs.toString(),
    groups: [sumUp('all reads', samples, all), ...groupsOf(history, samples, all, request)],
    leftOut: samples.leftOut,
  }
}

function groupsOf(
  history: History,
  samples: Samples,
  all: Int32Array,
  { by, keys }: FreshnessRequest,
): FreshnessGroup[] {
  if (by === undefined) return []
  if (by === 'mark') return marksOf(history, samples, all)
  if (by === 'key' && keys) {
    return keys.map((glob) => {
      const matches = keyGlob(glob)
      return sumUp(
        `keys ${glob}`,
        samples,
        all.filter((i) => matches(history.keys.name(history.key[samples.operation[i]]))),
      )
    })
  }
  const groups = new Map<string, number[]>()
  for (const i of all) {
    const operation = samples.operation[i]
    const name =
      by === 'key'
        ? `key ${history.keys.name(history.key[operation])}`
        : `client ${history.clients.name(history.client[operation])}`
    const members = groups.get(name)
    if (members) members.push(i)
    else groups.set(name, [i])
  }
  return [...groups]
    .sort(([a], [b]) => (a < b ? -1 : 1))
    .map(([name, members]) => sumUp(name, samples, Int32Array.from(members)))
}

/** Reads that ended before a mark began, overlapped it, or began after it ended. */
function marksOf(history: History, samples: Samples, all: Int32Array): FreshnessGroup[] {
  const { times } = history
  return history.marks.flatMap(({ text, startNs, endNs }) => {
    const relation = (i: number): string => {
      const operation = samples.operation[i]
      if (times.endNs(operation) < startNs) return 'before'
      return times.startNs(operation) > endNs ? 'after' : 'during'
    }
    const relations = Array.from(all, relation)
    return ['before', 'during', 'after'].map((which) =>
      sumUp(
        `${which} ${JSON.stringify(text)}`,
        samples,
        all.filter((_, place) => relations[place] === which),
      ),
    )
  })
}
