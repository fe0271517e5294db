/**
 * Register keys whose values are written once, by the order of their versions and nothing clever: every pair of
 * operations is looked at, and a cycle is searched for. For keys of a hundred operations, which no search over
 * sequences could finish. Source: semantics.md, "One engine" (Gibbons and Korach 1997, with more kinds of pairs).
 */
import type { PlainKey, PlainRule } from './brute-force.js'
import { countedPairs, type Operation, precedes, readKey, rolesOf } from './plain-pairs.js'

const INITIAL = 'the initial value'
type Version = Operation | typeof INITIAL

/** Whether the promise holds; undefined where some read could have seen several writes, or the key has increments. */
export function holdsByOrder(key: PlainKey, rule: PlainRule): boolean | undefined {
  const { all, kind } = readKey(key)
  if (kind !== 'register') return undefined
  const live = all.filter((op) => op.acked || (op.outcome === 'unsure' && op.writes))
  const text = (value: unknown): string => JSON.stringify(value ?? null)
  const writtenBy = new Map<string, Operation[]>()
  for (const op of live) {
    if (!op.writes) continue
    const value = text(op.op === 'delete' ? null : op.value)
    writtenBy.set(value, [...(writtenBy.get(value) ?? []), op])
  }
  const offered = new Set(
    all.filter((op) => op.op !== 'read' && !live.includes(op)).map((op) => text(op.value)),
  )
  for (const op of all) if (op.op === 'cas' && op.acked && op.applied === false) offered.add(text(op.value))

  let initial = key.initialUnknown && key.initial === undefined ? undefined : text(key.initial)
  const found = new Map<Operation, Version>()
  /** The version that a value names, `wrong` for none, undefined for several. */
  const versionOf = (value: string): Version | 'wrong' | undefined => {
    const writers = writtenBy.get(value) ?? []
    if (writers.length === 0 && initial === undefined && !offered.has(value)) initial = value
    if (writers.length + Number(value === initial) > 1) return undefined
    return value === initial ? INITIAL : (writers[0] ?? 'wrong')
  }
  const applied = new Set(live.filter((op) => op.acked && op.writes))
  const queue = live.filter((op) => op.reads)
  for (const op of queue) {
    if (op.op === 'cas' && op.acked && op.applied === false && op.saw === undefined) return undefined
    const isFailed = op.acked && op.applied === false
    const version = versionOf(text(op.op === 'read' ? op.value : isFailed ? op.saw : op.expect))
    if (version === undefined) return undefined
    if (version === 'wrong') return false
    found.set(op, version)
    if (version === INITIAL || applied.has(version)) continue
    // An unsure write that was seen took effect, and a cas among them found what it expected.
    applied.add(version)
    if (version.op === 'cas') queue.push(version)
  }
  for (const [op, version] of found) {
    if (version !== INITIAL && op.acked && precedes(key, op, version)) return false
  }

  // Chains of cas go as one block.
  const next = new Map<Version, Operation>()
  for (const [op, version] of found) {
    if (!applied.has(op)) continue
    if (next.has(version)) return false
    next.set(version, op)
  }
  const block = new Map<Version, number>()
  const place = new Map<Version, number>()
  const roots: Version[] = [INITIAL, ...[...applied].filter((op) => !found.has(op))]
  roots.forEach((root, b) => {
    let at = 0
    for (let v: Version | undefined = root; v !== undefined; v = next.get(v)) {
      block.set(v, b)
      place.set(v, at++)
    }
  })
  if ([...applied].some((op) => !block.has(op))) return false

  const counted = countedPairs(key, rule, kind, all)
  // A cas, in both its roles, stands where its own version begins: after everything that returned the one it found.
  const standsIn = (op: Operation): Version => (applied.has(op) ? op : found.get(op)!)
  const taking = live.filter((op) => found.has(op) || applied.has(op))
  const after: Set<number>[] = roots.map(() => new Set())
  // The initial value precedes everything.
  for (let b = 1; b < roots.length; b++) after[0].add(b)
  for (const a of taking) {
    for (const b of taking) {
      if (!precedes(key, a, b)) continue
      for (const ra of rolesOf(a)) {
        for (const rb of rolesOf(b)) {
          if (!counted(a, ra, b, rb)) continue
          const [v, w] = [standsIn(a), standsIn(b)]
          if (v === w) continue
          const [from, to] = [block.get(v)!, block.get(w)!]
          if (from !== to) after[from].add(to)
          else if (place.get(v)! > place.get(w)!) return false
        }
      }
    }
  }
  if (hasCycle(after)) return false
  if (rule.versions === undefined) return true
  return [...found].every(([r, v]) => {
    const between = [...applied].filter(
      (w) => w.acked && precedes(key, w, r) && (v === INITIAL || precedes(key, v, w)),
    )
    return !r.acked || between.length <= rule.versions!
  })
}

/** Takes away what nothing leads to until nothing is left, or until nothing can be taken. */
function hasCycle(after: readonly ReadonlySet<number>[]): boolean {
  let left = after.map((_, i) => i)
  for (;;) {
    const led = new Set(left.flatMap((i) => [...after[i]]))
    const rest = left.filter((i) => led.has(i))
    if (rest.length === left.length) return left.length > 0
    left = rest
  }
}
