/**
 * Precedence (semantics.md): `a ≺ b`, a certainly finished before b began.
 */
import type { KeyHistory } from './key-history.js'

/** Which rule makes a pair of operations precede, strongest evidence first. */
export type PrecedenceRule = 'session' | 'host' | 'clock'

/** The rule by which local operation `a` precedes local operation `b`, or undefined. O(1). */
export function precedenceRule(key: KeyHistory, a: number, b: number): PrecedenceRule | undefined {
  if (key.acked[a] === 0 || a === b) return undefined
  // Local order is session order, and a client's operations do not overlap (the reader checks).
  if (key.client[a] === key.client[b]) return a < b ? 'session' : undefined
  if (key.host[a] === key.host[b]) return key.end[a] < key.start[b] ? 'host' : undefined
  return key.sureEnd[a] < key.start[b] ? 'clock' : undefined
}

/** Whether local operation `a` certainly finished before local operation `b` began. */
export function precedes(key: KeyHistory, a: number, b: number): boolean {
  return precedenceRule(key, a, b) !== undefined
}
