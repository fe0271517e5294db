/**
 * What a single-key promise is to the deciders: which pairs of operations it counts (semantics.md's table).
 */

/** Which of the pairs `a ≺ b` of one class count. */
export type Scope =
  /** none of them */
  | 'none'
  /** those in session order: one client's */
  | 'session'
  /** every one */
  | 'all'
  /** those where b certainly starts more than `withinNs` after a ended */
  | 'late'
  /** those where b is a closing read: every acked write precedes it and ended at least `settleNs` before */
  | 'closing'

/** The names of the single-key promises of semantics.md. */
export const SINGLE_KEY_PROMISES = [
  'written-values',
  'read-your-writes',
  'monotonic-reads',
  'monotonic-writes',
  'writes-follow-reads',
  'coherent',
  'bounded-staleness',
  'durable',
  'no-lost-updates',
  'regular',
  'linearizable',
] as const
export type SingleKeyPromiseName = (typeof SINGLE_KEY_PROMISES)[number]

/**
 * The pairs of a promise, by the classes of a and b. On register and mixed keys write–write pairs count under
 * every promise, on counter keys only as `counterWriteWrite` says.
 */
export interface PairRule {
  readonly name: SingleKeyPromiseName
  /** increment before increment, on counter keys */
  readonly counterWriteWrite: 'none' | 'session' | 'all'
  readonly writeRead: Scope
  readonly readWrite: 'none' | 'session' | 'all'
  readonly readRead: 'none' | 'session' | 'all'
  /** `late`: nanoseconds */
  readonly withinNs?: bigint
  /** `closing`: nanoseconds */
  readonly settleNs?: bigint
  /** bounded-staleness: at most so many acked writes between a read's version and the read */
  readonly versions?: number
}

/** The role in which an operation takes part in a pair; a cas that was applied has both. */
export type Role = 'read' | 'write'
