/**
 * The promises of a single key read out of their definition literally: every choice of unsure operations, every
 * sequence, every pair. No memory of states, no cleverness; for half a dozen operations. It keeps `brute-force.ts`,
 * which is quicker, honest. Shares no code with it or with src/.
 */
import type { PlainKey, PlainOperation, PlainRule } from './brute-force.js'

interface Operation extends PlainOperation {
  readonly at: number
  readonly acked: boolean
  readonly reads: boolean
  readonly writes: boolean
}

type Role = 'read' | 'write'
type Kind = 'register' | 'counter' | 'mixed'
type Pair = (a: Operation, b: Operation) => boolean

/** A sequence that shows the promise kept, or undefined where there is none. */
export function witnessByDefinition(key: PlainKey, rule: PlainRule): PlainOperation[] | undefined {
  const all = key.operations.map((op, at): Operation => {
    const outcome = op.outcome ?? (op.end === undefined ? 'unsure' : 'acked')
    const acked = outcome === 'acked'
    const failed = op.op === 'cas' && acked && op.applied === false
    const answered = op.op === 'read' || op.op === 'cas' || (op.op === 'increment' && op.value !== undefined)
    return { ...op, outcome, at, acked, reads: acked && answered, writes: op.op !== 'read' && !failed }
  })
  const isKind = (...ops: string[]): boolean => all.some(({ op }) => ops.includes(op))
  const changes = isKind('write', 'cas', 'delete')
  const kind: Kind = !isKind('increment') ? 'register' : changes ? 'mixed' : 'counter'
  const acked = all.filter((op) => op.acked)
  const unsure = all.filter((op) => op.outcome === 'unsure' && op.op !== 'read')
  const counted = countedPairs(key, rule, kind, acked)
  for (const initial of possibleStarts(key, kind, all)) {
    for (const chosen of subsets(unsure)) {
      const sequence = arrange([...acked, ...chosen], [], initial, key, rule, kind, counted, all)
      if (sequence) return sequence.map(({ at }) => key.operations[at])
    }
  }
  return undefined
}

function subsets<T>(items: readonly T[]): T[][] {
  if (items.length === 0) return [[]]
  const without = subsets(items.slice(1))
  return [...without, ...without.map((set) => [items[0], ...set])]
}

/** Puts what is left behind `placed` in every order that answers as recorded. */
function arrange(
  left: readonly Operation[],
  placed: readonly Operation[],
  initial: unknown,
  key: PlainKey,
  rule: PlainRule,
  kind: Kind,
  counted: Pair,
  all: readonly Operation[],
): readonly Operation[] | undefined {
  if (left.length === 0) return placed
  for (const next of left) {
    if (placed.some((earlier) => counted(next, earlier))) continue
    if (!answersAsRecorded(next, placed, initial, key, rule, kind, all)) continue
    const rest = left.filter((op) => op !== next)
    const sequence = arrange(rest, [...placed, next], initial, key, rule, kind, counted, all)
    if (sequence) return sequence
  }
  return undefined
}

/** a ≺ b: rules 1 to 3. */
function precedes(key: PlainKey, a: Operation, b: Operation): boolean {
  if (!a.acked || a === b) return false
  if (a.client === b.client) {
    if (a.end! > b.start) return false
    const otherWayRoundToo = b.end !== undefined && b.end <= a.start
    return !otherWayRoundToo || a.at < b.at
  }
  return a.end! + clocksApart(key, a, b) < b.start
}

/** 2·clockError between different clients on different hosts; a client without a host has a clock of its own. */
function clocksApart(key: PlainKey, a: Operation, b: Operation): number {
  if (a.client === b.client) return 0
  return a.host !== undefined && a.host === b.host ? 0 : 2 * key.clockError
}

/** The promises' table. */
function countedPairs(key: PlainKey, rule: PlainRule, kind: Kind, acked: readonly Operation[]): Pair {
  const { promise, within, settle = 0 } = rule
  const certainlyAfter = (a: Operation, b: Operation): number => b.start - a.end! - clocksApart(key, a, b)
  const isClosing = (b: Operation): boolean =>
    acked.every((w) => !w.writes || (precedes(key, w, b) && certainlyAfter(w, b) >= settle))
  const ofPromise = (a: Operation, ra: Role, b: Operation, rb: Role): boolean => {
    const session = a.client === b.client
    const pair = `${ra}-${rb}`
    if (promise === 'linearizable') return true
    if (promise === 'regular') return pair !== 'read-read'
    if (promise === 'coherent') return session
    if (promise === 'read-your-writes') return session && pair === 'write-read'
    if (promise === 'monotonic-reads') return session && pair === 'read-read'
    if (promise === 'writes-follow-reads') return session && pair === 'read-write'
    if (promise === 'durable') return pair === 'write-read' && isClosing(b)
    if (promise === 'bounded-staleness')
      return within !== undefined && pair === 'write-read' && certainlyAfter(a, b) > within
    if (promise === 'written-values' || promise === 'monotonic-writes') return false
    throw new Error(`no such promise: ${promise}`)
  }
  return (a, b) => {
    if (!precedes(key, a, b)) return false
    const ofA = (['read', 'write'] as const).filter((role) => (role === 'read' ? a.reads : a.writes))
    const ofB = (['read', 'write'] as const).filter((role) => (role === 'read' ? b.reads : b.writes))
    return ofA.some((ra) =>
      ofB.some((rb) => {
        if (ra === 'write' && rb === 'write' && kind !== 'counter') return true
        // A read of a counter does not include an increment that it precedes.
        if (ra === 'read' && rb === 'write' && kind === 'counter') return true
        return ofPromise(a, ra, b, rb)
      }),
    )
  }
}

/** Whether a single copy of the key, left by `placed`, answers this operation as it was recorded. */
function answersAsRecorded(
  op: Operation,
  placed: readonly Operation[],
  initial: unknown,
  key: PlainKey,
  rule: PlainRule,
  kind: Kind,
  all: readonly Operation[],
): boolean {
  let value = initial
  let lastWrite: Operation | undefined
  let since: Operation[] = []
  for (const each of placed) {
    if (!each.writes) continue
    if (each.op === 'increment') {
      value = (value as number) + (each.by ?? 1)
      since.push(each)
    } else {
      value = each.op === 'delete' ? null : each.value
      lastWrite = each
      since = []
    }
  }
  // On a key with increments, absence counts as 0.
  const same = (a: unknown, b: unknown): boolean =>
    JSON.stringify(kind === 'register' ? (a ?? null) : (a ?? 0)) ===
    JSON.stringify(kind === 'register' ? (b ?? null) : (b ?? 0))
  const mayReturn = (): boolean => {
    if (lastWrite && precedes(key, op, lastWrite)) return false
    if (since.some((increment) => precedes(key, op, increment))) return false
    if (rule.versions === undefined || kind !== 'register') return true
    const between = all.filter(
      (w) => w.acked && w.writes && precedes(key, w, op) && (!lastWrite || precedes(key, lastWrite, w)),
    )
    return between.length <= rule.versions
  }
  switch (op.op) {
    case 'read':
      return same(op.value, value) && mayReturn()
    case 'cas':
      if (op.acked && op.applied === false)
        return op.saw === undefined ? !same(op.expect, value) : same(op.saw, value) && mayReturn()
      return same(op.expect, value) && (!op.acked || mayReturn())
    case 'increment': {
      const count = value ?? 0
      if (!Number.isInteger(count)) return false
      return !op.reads || (op.value === (count as number) + (op.by ?? 1) && mayReturn())
    }
    default:
      return true
  }
}

/** What the key may have started with. */
function possibleStarts(key: PlainKey, kind: Kind, all: readonly Operation[]): unknown[] {
  if (key.initial !== undefined) return [key.initial]
  if (!key.initialUnknown) return [kind === 'register' ? null : 0]
  const effective = all.filter((op) => op.outcome !== 'refused')
  if (kind !== 'register') {
    // A count within reach of what was read; a mixed key may have held something else as well.
    const seen = [0, ...effective.flatMap(({ value, expect, saw }) => [value, expect, saw])].filter(
      (value): value is number => typeof value === 'number',
    )
    const reach = effective.reduce((sum, { by }) => sum + Math.abs(by ?? 1), 1)
    const least = Math.min(...seen) - reach
    const counts = Array.from({ length: Math.max(...seen) + reach - least + 1 }, (_, i) => least + i)
    return kind === 'counter' ? counts : [...counts, 'something else']
  }
  // The one value that was found and that nobody wrote or offered; else a value that plays no part.
  const text = (value: unknown): string => JSON.stringify(value ?? null)
  const given = new Set(
    all.filter(({ op }) => op !== 'read').map(({ op, value }) => text(op === 'delete' ? null : value)),
  )
  const found = effective.flatMap((op) => {
    if (op.op === 'read') return op.acked ? [op.value] : []
    if (op.op !== 'cas') return []
    return op.acked && op.applied === false ? (op.saw === undefined ? [] : [op.saw]) : [op.expect]
  })
  return [...found.filter((value) => !given.has(text(value))), { plays: 'no part' }]
}
