/**
 * Witnesses: one sequence of a key's operations that keeps the promise, made from what the deciders know.
 */
import type { Values } from '../history/columns.js'
import { chainBlocks } from '../order/blocks.js'
import { type Counting, countPairs } from '../order/counting.js'
import { sortUnits } from '../order/interval-orders.js'
import type { KeyHistory } from '../order/key-history.js'
import { isRead, isWrite } from '../order/roles.js'
import { versionOrders } from '../order/version-orders.js'
import { findVersions } from '../order/versions.js'
import { linearizable } from '../promises/linearizable.js'
import type { PairRule } from '../promises/promise.js'
import { counterOrder } from './counter-order.js'
import { decideByVersions, kindOfKey } from './decide-key.js'
import { initialFirst } from './register.js'
import type { Purse } from './search/budget.js'
import { UNRESOLVED } from './search/candidates.js'
import { searchThrough } from './search/search.js'
import { withHidden } from './search/with-hidden.js'

/**
 * Local indices of the operations in a sequence that keeps the promise: all acked ones, and the unsure ones that took
 * effect in it. Undefined where there is none, or none was found within the purse.
 */
export function witness(key: KeyHistory, values: Values, rule: PairRule, purse: Purse): number[] | undefined {
  const counting = countPairs(key, rule)
  const kind = kindOfKey(key)
  if (kind === 'counter') {
    const order = counterOrder(counting, values)
    if (order !== 'search') return order
  }
  if (kind === 'register') {
    const { verdict, resolved } = decideByVersions(counting)
    if (verdict === 'broken') return undefined
    if (verdict === 'holds')
      return registerOrder(resolved === undefined ? counting : { ...counting, resolved })
  }
  // An order that answers as one copy would in real time keeps every other promise.
  const strongest = rule.name === 'linearizable' ? undefined : witness(key, values, linearizable, purse)
  if (strongest) return strongest
  const outcome = searchThrough(counting, values, purse)
  if (outcome.found !== 'order') return undefined
  if (kind === 'counter') return [...outcome.sequence]
  if (kind === 'mixed') return withHidden(counting, outcome.sequence)
  return registerOrder({ ...counting, resolved: whatWasSeen(key, outcome.sequence) })
}

/** Local index → the write that each read of a sequence saw. */
function whatWasSeen(key: KeyHistory, sequence: readonly number[]): Int32Array {
  const seen = new Int32Array(key.n).fill(UNRESOLVED)
  let last = -1
  for (const p of sequence) {
    seen[p] = last
    if (isWrite(key, p)) last = p
  }
  return seen
}

/** The versions in their order, each write with its reads behind it. */
function registerOrder(counting: Counting): number[] {
  const { key } = counting
  const versions = findVersions(key, counting.resolved)
  const blocks = chainBlocks(versions)
  const orders = versionOrders(counting, versions, blocks.blockOf)
  if (blocks.count > 1 && versions.isInitialSeen) orders.push(initialFirst(blocks))
  const { order } = sortUnits(blocks.count, orders)
  const rank = new Int32Array(blocks.count)
  order.forEach((block, r) => {
    rank[block] = r
  })
  const byPlace = Array.from({ length: versions.count }, (_, v) => v).sort(
    (a, b) => rank[blocks.blockOf[a]] - rank[blocks.blockOf[b]] || blocks.placeOf[a] - blocks.placeOf[b],
  )
  const readsOf: number[][] = Array.from({ length: versions.count }, () => [])
  for (let p = 0; p < key.n; p++) {
    // An applied cas stands where it wrote.
    if (isRead(key, p) && versions.writeOf[p] < 0) readsOf[versions.readOf[p]].push(p)
  }
  return byPlace.flatMap((v) => (versions.writer[v] < 0 ? readsOf[v] : [versions.writer[v], ...readsOf[v]]))
}
