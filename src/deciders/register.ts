/**
 * Register keys on which every read names its version: order the versions (semantics.md, "One engine").
 *
 * The key holds exactly when no read is wrong by itself, every version was found by at most one cas, and the
 * counted pairs let the blocks of versions be put in one order with the initial value first.
 */
import { type Blocks, chainBlocks } from '../order/blocks.js'
import type { Counting } from '../order/counting.js'
import { type IntervalOrder, sortUnits } from '../order/interval-orders.js'
import { versionOrders } from '../order/version-orders.js'
import { findVersions, type Versions } from '../order/versions.js'

export interface RegisterOutcome {
  readonly verdict: 'holds' | 'broken' | 'ambiguous'
  readonly versions: Versions
}

/**
 * Decides a register key under the promise. `ambiguous`: some read could have seen several writes, and what the others
 * say is not broken by itself. O(n log n).
 */
export function decideRegister(counting: Counting): RegisterOutcome {
  const versions = findVersions(counting.key, counting.resolved)
  if (versions.wrongReads.length > 0 || versions.impossibleCas >= 0) return { verdict: 'broken', versions }
  const outcome = decideVersions(counting, versions)
  return outcome.verdict === 'holds' && versions.ambiguous >= 0 ? { verdict: 'ambiguous', versions } : outcome
}

function decideVersions(counting: Counting, versions: Versions): RegisterOutcome {
  const blocks = chainBlocks(versions)
  if (blocks.foundTwice.length > 0 || blocks.circular >= 0) return { verdict: 'broken', versions }

  if (blocks.count < versions.count) {
    const identity = Int32Array.from({ length: versions.count }, (_, v) => v)
    const orders = versionOrders(counting, versions, identity)
    if (orders.some((order) => chainRunsBackward(order, blocks))) return { verdict: 'broken', versions }
  }
  const orders = versionOrders(counting, versions, blocks.blockOf)
  // Where nobody read it, nothing can be required before it.
  if (blocks.count > 1 && versions.isInitialSeen) orders.push(initialFirst(blocks))
  const sorted = sortUnits(blocks.count, orders)
  if (sorted.stuck.length > 0) return { verdict: 'broken', versions }
  return { verdict: 'holds', versions }
}

/** The initial value precedes everything: its block must go before all others. */
export function initialFirst(blocks: Blocks): IntervalOrder {
  const { count } = blocks
  const first = blocks.blockOf[0]
  return {
    inSession: true,
    unit: Int32Array.from({ length: count }, (_, b) => b),
    minEnd: Float64Array.from({ length: count }, (_, b) => (b === first ? 0 : Number.POSITIVE_INFINITY)),
    maxStart: Float64Array.from({ length: count }, (_, b) => (b === first ? Number.NEGATIVE_INFINITY : 1)),
  }
}

/** Whether a pair leads from a later version of some chain to an earlier one. O(entries log entries). */
function chainRunsBackward(order: IntervalOrder, blocks: Blocks): boolean {
  const { unit, minEnd, maxStart } = order
  const entries = Array.from(unit.keys()).sort(
    (a, b) =>
      blocks.blockOf[unit[a]] - blocks.blockOf[unit[b]] || blocks.placeOf[unit[a]] - blocks.placeOf[unit[b]],
  )
  let block = -1
  let latestStart = Number.NEGATIVE_INFINITY
  for (const e of entries) {
    if (blocks.blockOf[unit[e]] !== block) {
      block = blocks.blockOf[unit[e]]
      latestStart = Number.NEGATIVE_INFINITY
    }
    if (minEnd[e] < latestStart) return true
    if (maxStart[e] > latestStart) latestStart = maxStart[e]
  }
  return false
}
