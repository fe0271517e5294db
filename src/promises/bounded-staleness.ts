import type { PairRule } from './promise.js'

/**
 * A read is at most so stale: a write counts as before the reads that certainly start more than `withinNs` after
 * it ended; at most `versions` acked writes lie between a read's version and the read. At least one of the two.
 */
export function boundedStaleness(bounds: { withinNs?: bigint; versions?: number }): PairRule {
  return {
    name: 'bounded-staleness',
    counterWriteWrite: 'none',
    writeRead: bounds.withinNs === undefined ? 'none' : 'late',
    readWrite: 'none',
    readRead: 'none',
    ...bounds,
  }
}
