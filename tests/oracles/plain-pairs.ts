/**
 * Which pairs of operations a promise counts, read out of the documents: precedence, certainty, the promises' table.
 * For `by-definition.ts` and `plain-order.ts`; shares no code with `brute-force.ts` or with src/.
 */
import type { PlainKey, PlainOperation, PlainRule } from './brute-force.js'

export interface Operation extends PlainOperation {
  readonly at: number
  readonly acked: boolean
  readonly reads: boolean
  readonly writes: boolean
}

export type Role = 'read' | 'write'
export type Kind = 'register' | 'counter' | 'mixed'
export type PairInRoles = (a: Operation, ra: Role, b: Operation, rb: Role) => boolean

/** The records with what follows from each by itself, and the kind of the key, whatever their outcome. */
export function readKey(key: PlainKey): { all: Operation[]; kind: Kind } {
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
  return { all, kind }
}

/** a ≺ b: rules 1 to 3. */
export function precedes(key: PlainKey, a: Operation, b: Operation): boolean {
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
export function countedPairs(
  key: PlainKey,
  rule: PlainRule,
  kind: Kind,
  all: readonly Operation[],
): PairInRoles {
  const { promise, within, settle = 0 } = rule
  const certainlyAfter = (a: Operation, b: Operation): number => b.start - a.end! - clocksApart(key, a, b)
  const closing = new Set(
    all.filter((b) =>
      all.every((w) => !w.acked || !w.writes || (precedes(key, w, b) && certainlyAfter(w, b) >= settle)),
    ),
  )
  const ofPromise = (a: Operation, ra: Role, b: Operation, rb: Role): boolean => {
    const session = a.client === b.client
    const pair = `${ra}-${rb}`
    if (promise === 'linearizable') return true
    if (promise === 'regular') return pair !== 'read-read'
    if (promise === 'coherent') return session
    if (promise === 'read-your-writes') return session && pair === 'write-read'
    if (promise === 'monotonic-reads') return session && pair === 'read-read'
    if (promise === 'writes-follow-reads') return session && pair === 'read-write'
    if (promise === 'durable') return pair === 'write-read' && closing.has(b)
    if (promise === 'bounded-staleness')
      return within !== undefined && pair === 'write-read' && certainlyAfter(a, b) > within
    if (promise === 'written-values' || promise === 'monotonic-writes') return false
    throw new Error(`no such promise: ${promise}`)
  }
  return (a, ra, b, rb) => {
    if (!precedes(key, a, b)) return false
    if (ra === 'write' && rb === 'write' && kind !== 'counter') return true
    // A read of a counter does not include an increment that it precedes.
    if (ra === 'read' && rb === 'write' && kind === 'counter') return true
    return ofPromise(a, ra, b, rb)
  }
}

/** Whether the pair counts in any of the roles that the two operations have. */
export function countsAtAll(counted: PairInRoles, a: Operation, b: Operation): boolean {
  return rolesOf(a).some((ra) => rolesOf(b).some((rb) => counted(a, ra, b, rb)))
}

export function rolesOf({ reads, writes }: Operation): Role[] {
  return [...(reads ? (['read'] as const) : []), ...(writes ? (['write'] as const) : [])]
}
