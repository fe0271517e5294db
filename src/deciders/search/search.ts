/**
 * Keys that no polynomial decider answers: values written more than once, failed cas that do not say what they saw,
 * increments of several sizes or together with writes.
 */
import type { Values } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import type { Purse } from './budget.js'
import { type SweepOutcome, sweep } from './sweep.js'

/**
 * Searches for an order of the key's operations under the promise. First unsure writes are without end once they have
 * begun; only values of which that uses too many are counted.
 */
export function* search(counting: Counting, values: Values, purse: Purse): Generator<void, SweepOutcome> {
  const counted = new Set<number>()
  for (;;) {
    const outcome = yield* sweep(counting, values, counted, purse)
    if (outcome.found !== 'overuse') return outcome
    for (const value of outcome.values) counted.add(value)
  }
}

/** Runs a search to its end. */
export function searchThrough(counting: Counting, values: Values, purse: Purse): SweepOutcome {
  const steps = search(counting, values, purse)
  for (;;) {
    const next = steps.next()
    if (next.done) return next.value
  }
}
