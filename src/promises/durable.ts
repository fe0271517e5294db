import type { PairRule } from './promise.js'

/**
 * Acked writes outlive the run: they count as before closing reads, those that every acked write of the key
 * precedes and that certainly start at least `settleNs` after each of them ended.
 */
export function durable(settleNs = 0n): PairRule {
  return {
    name: 'durable',
    counterWriteWrite: 'none',
    writeRead: 'closing',
    readWrite: 'none',
    readRead: 'none',
    settleNs,
  }
}
