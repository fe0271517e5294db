/**
 * Keys that no polynomial decider answers: values written more than once, failed cas that do not say what they saw,
 * increments of several sizes or together with writes.
 */
import type { Values } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import type { Purse } from './budget.js'
import { type SweepOutcome, sweep } from './sweep.js'

/** An order, that there is none, or that the purse was empty before either was clear. */
export type SearchOutcome = Exclude<SweepOutcome, { found: 'overuse' }>

/** Configurations kept where only an order is looked for, not its absence. */
const BREADTH = 200

/** Steps before the place where it got stuck from which on unsure writes are counted, at first. */
const REACH = 500

/**
 * Searches for an order of the key's operations under the promise. First as if there were no end of unsure writes
 * once they have begun: without an order then, there is none. Then for an order that uses each only once, among few
 * configurations. Only then those values are counted of which too many were used.
 */
export function* search(counting: Counting, values: Values, purse: Purse): Generator<void, SearchOutcome> {
  const counted = new Set<number>()
  const all = { counted, countedFrom: 0 }
  const few = { ...all, breadth: BREADTH }
  if (counting.key.hasIncrements) {
    // Each unsure increment counts here, and sums are many: look for an order first.
    const thrifty = yield* sweep(counting, values, few, purse)
    if (thrifty.found === 'order' || thrifty.found === 'spent') return thrifty
  }
  let outcome = yield* sweep(counting, values, all, purse)
  if (outcome.found !== 'overuse') return outcome
  const thrifty = yield* sweep(counting, values, few, purse)
  if (thrifty.found === 'order' || thrifty.found === 'spent') return thrifty
  // Counting from shortly before the thrifty search got stuck is often enough to see that there is no order.
  const stuck = thrifty.found === 'none' ? thrifty.step : 0
  for (let reach = REACH; outcome.found === 'overuse'; reach *= 4) {
    for (const value of outcome.values) counted.add(value)
    outcome = yield* sweep(counting, values, { counted, countedFrom: Math.max(0, stuck - reach) }, purse)
  }
  return outcome
}

/** Runs a search to its end. */
export function searchThrough(counting: Counting, values: Values, purse: Purse): SearchOutcome {
  const steps = search(counting, values, purse)
  for (;;) {
    const next = steps.next()
    if (next.done) return next.value
  }
}
