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
 * Searches for an order of the key's operations under the promise. Where there are unsure writes, first for one that
 * uses each only once, among few configurations. Then as if there were no end of unsure writes once they have begun:
 * without an order then, there is none. Only then those values are counted of which too many were used.
 */
export function* search(counting: Counting, values: Values, purse: Purse): Generator<void, SearchOutcome> {
  const counted = new Set<number>()
  const all = { counted, countedFrom: 0 }
  let stuck = 0
  if (counting.key.acked.includes(0)) {
    const thrifty = yield* sweep(counting, values, { ...all, breadth: BREADTH }, purse)
    if (thrifty.found === 'order' || thrifty.found === 'spent') return thrifty
    if (thrifty.found === 'none') stuck = thrifty.step
  }
  let outcome = yield* sweep(counting, values, all, purse)
  // Counting from shortly before the thrifty search got stuck is often enough to see that there is no order.
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
