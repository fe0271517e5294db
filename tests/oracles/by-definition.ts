/**
 * The promises of a single key read out of their definition literally: every choice of unsure operations, every
 * sequence, every pair. No memory of states, no cleverness; for half a dozen operations. It keeps `brute-force.ts`,
 * which is quicker, honest. Shares no code with it or with src/.
 */
import type { PlainKey, PlainOperation, PlainRule } from './brute-force.js'
import {
  countedPairs,
  countsAtAll,
  type Kind,
  type Operation,
  type PairInRoles,
  precedes,
  readKey,
} from './plain-pairs.js'

/** A sequence that shows the promise kept, or undefined where there is none. */
export function witnessByDefinition(key: PlainKey, rule: PlainRule): PlainOperation[] | undefined {
  const { all, kind } = readKey(key)
  const acked = all.filter((op) => op.acked)
  const unsure = all.filter((op) => op.outcome === 'unsure' && op.op !== 'read')
  const counted = countedPairs(key, rule, kind, all)
  for (const initial of possibleStarts(key, kind, all)) {
    for (const chosen of subsets(unsure)) {
      const sequence = arrange([...acked, ...chosen], [], initial, key, rule, kind, counted, all)
      if (sequence) return sequence.map(({ at }) => key.operations[at])
    }
  }
  return undefined
}

/** Whether this sequence of operations, by their places in the key, shows the promise kept. */
export function isWitnessByDefinition(key: PlainKey, rule: PlainRule, sequence: readonly number[]): boolean {
  const { all, kind } = readKey(key)
  const placed = sequence.map((at) => all[at])
  const isUsable = (op: Operation | undefined): boolean =>
    op !== undefined && (op.acked || (op.outcome === 'unsure' && op.op !== 'read'))
  if (!placed.every(isUsable) || new Set(placed).size < placed.length) return false
  if (all.some((op) => op.acked && !placed.includes(op))) return false
  const counted = countedPairs(key, rule, kind, all)
  if (placed.some((b, at) => placed.slice(at + 1).some((a) => countsAtAll(counted, a, b)))) return false
  return possibleStarts(key, kind, all).some((initial) =>
    placed.every((op, at) => answersAsRecorded(op, placed.slice(0, at), initial, key, rule, kind, all)),
  )
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
  counted: PairInRoles,
  all: readonly Operation[],
): readonly Operation[] | undefined {
  if (left.length === 0) return placed
  for (const next of left) {
    if (placed.some((earlier) => countsAtAll(counted, next, earlier))) continue
    if (!answersAsRecorded(next, placed, initial, key, rule, kind, all)) continue
    const rest = left.filter((op) => op !== next)
    const sequence = arrange(rest, [...placed, next], initial, key, rule, kind, counted, all)
    if (sequence) return sequence
  }
  return undefined
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
    const met = effective.flatMap(({ value, expect, saw }) => [value, expect, saw])
    const seen = [0, ...met.filter((value): value is number => typeof value === 'number')]
    const others = met.filter((value) => typeof value === 'string')
    const reach = effective.reduce((sum, { by }) => sum + Math.abs(by ?? 1), 1)
    const least = Math.min(...seen) - reach
    const counts = Array.from({ length: Math.max(...seen) + reach - least + 1 }, (_, i) => least + i)
    return kind === 'counter' ? counts : [...counts, ...others, { plays: 'no part' }]
  }
  // The one value that was found and that nobody wrote or offered, absence (deletes may write it too), or a value
  // that plays no part.
  const text = (value: unknown): string => JSON.stringify(value ?? null)
  const given = new Set(
    all.filter(({ op }) => op !== 'read').map(({ op, value }) => text(op === 'delete' ? null : value)),
  )
  const found = effective.flatMap((op) => {
    if (op.op === 'read') return op.acked ? [op.value] : []
    if (op.op !== 'cas') return []
    return op.acked && op.applied === false ? (op.saw === undefined ? [] : [op.saw]) : [op.expect]
  })
  return [...found.filter((value) => !given.has(text(value))), null, { plays: 'no part' }]
}
