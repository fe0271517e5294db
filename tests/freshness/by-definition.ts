/** Freshness of one key by its definition, every pair looked at. Shares no code with src/. */
import type { PlainKey } from '../oracles/brute-force.js'
import { type Operation, precedes, readKey } from '../oracles/plain-pairs.js'

export interface PlainRead {
  readonly at: number
  /** undefined where no acked write precedes the read */
  readonly lag: number | undefined
  readonly staleness: number
  readonly versions: number
}

/** The reads, and failed cas that say what they saw, of which one write alone can be what they saw. */
export function freshnessByDefinition(key: PlainKey): { reads: PlainRead[] } {
  const { all, kind } = readKey(key)
  const reads: PlainRead[] = []
  if (kind !== 'register') return { reads }
  const writers = all.filter(({ writes, outcome }) => writes && outcome !== 'refused')
  const text = (value: unknown): string => JSON.stringify(value ?? null)
  const written = (w: Operation): string => text(w.op === 'delete' ? null : w.value)
  for (const r of all) {
    if (!r.reads || (r.op === 'cas' && (r.applied !== false || r.saw === undefined))) continue
    const value = text(r.op === 'cas' ? r.saw : r.value)
    const candidates: ('initial' | Operation)[] = writers.filter((w) => written(w) === value)
    if (text(key.initial) === value) candidates.push('initial')
    const [seen] = candidates
    if (candidates.length !== 1 || (seen !== 'initial' && precedes(key, r, seen))) continue
    const before = writers.filter((w) => w.acked && precedes(key, w, r))
    const over = before.filter((w) => seen === 'initial' || precedes(key, seen, w))
    reads.push({
      at: r.at,
      lag: before.length === 0 ? undefined : r.start - Math.max(...before.map(({ end }) => end!)),
      staleness: over.length === 0 ? 0 : r.start - Math.min(...over.map(({ end }) => end!)),
      versions: over.length,
    })
  }
  return { reads }
}
