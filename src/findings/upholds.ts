/**
 * Which promises a broken key still upholds: the strongest that hold and were put to the test.
 */
import { decideKey } from '../deciders/decide-key.js'
import type { Values } from '../history/columns.js'
import type { KeyHistory } from '../order/key-history.js'
import type { SingleKeyPromiseName } from '../promises/promise.js'
import { SINGLE_KEY } from '../promises/table.js'

/** Promises without parameters, each with those that it implies (semantics: as their pairs do). */
const IMPLIES: Partial<Record<SingleKeyPromiseName, readonly SingleKeyPromiseName[]>> = {
  linearizable: [
    'regular',
    'coherent',
    'durable',
    'read-your-writes',
    'monotonic-reads',
    'writes-follow-reads',
    'written-values',
  ],
  regular: ['durable', 'written-values'],
  coherent: ['read-your-writes', 'monotonic-reads', 'writes-follow-reads', 'written-values'],
  durable: ['written-values'],
  'read-your-writes': ['written-values'],
  'monotonic-reads': ['written-values'],
  'writes-follow-reads': ['written-values'],
  'no-lost-updates': [],
  'written-values': [],
}

/** What is not decided by then is not listed: this is told beside the verdicts, it is none. */
const SHORT_SEARCH = { steps: 10_000 }

/** Names of the strongest promises that the key upholds; empty when it upholds none. */
export function upheld(key: KeyHistory, values: Values): SingleKeyPromiseName[] {
  const names = Object.keys(IMPLIES) as SingleKeyPromiseName[]
  const kept = names.filter((name) => {
    const decision = decideKey(key, values, SINGLE_KEY[name].rule({}), SHORT_SEARCH)
    return decision.verdict === 'holds' && !decision.untested
  })
  return kept.filter((name) => !kept.some((stronger) => IMPLIES[stronger]!.includes(name)))
}
