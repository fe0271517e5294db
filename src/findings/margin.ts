/**
 * Margin: the largest clock error under which something is still broken, in whole nanoseconds, or `unbounded` when
 * session order and pairs on one clock break it by themselves.
 */
import { decideKey } from '../deciders/decide-key.js'
import { SMALL_BUDGET } from '../deciders/search/budget.js'
import type { History } from '../history/columns.js'
import { type Counting, countPairs } from '../order/counting.js'
import { gatherKey, gatherOperations, type KeyIndex } from '../order/key-history.js'
import { isRead, isWrite } from '../order/roles.js'
import type { PairRule } from '../promises/promise.js'
import { START, Tallies } from './counter/tallies.js'
import type { Link, RawFinding } from './raw-finding.js'

/** Nanoseconds, or no clock explains it. */
export type Margin = bigint | 'unbounded'

/**
 * Clock error of an ordinary fleet synchronised by NTP, in nanoseconds: common practice reckons with some
 * milliseconds.
 */
export const ORDINARY_CLOCK_ERROR_NS = 5_000_000n

/** Beyond any difference of two times: no pair of two clocks counts any more. */
const ANY_CLOCK = 2n ** 64n

export function lesser(a: Margin, b: Margin): Margin {
  if (a === 'unbounded') return b
  return b === 'unbounded' || a < b ? a : b
}

export function greater(a: Margin, b: Margin): Margin {
  return a === 'unbounded' || b === 'unbounded' ? 'unbounded' : a > b ? a : b
}

/**
 * The margin of a finding's own evidence: up to it every pair of its chain still counts (a counter's: its bounds
 * are still crossed). The key may be broken beyond it by other evidence.
 */
export function findingMargin(counting: Counting, index: KeyIndex, finding: RawFinding): Margin | undefined {
  if (counting.rule.name === 'no-lost-updates') return 'unbounded'
  if (finding.bounds) return boundsMargin(counting, index, finding)
  const { key } = counting
  // Slots that cannot be filled have no chain of their own: the key's margin is theirs.
  if (finding.kind === 'order-conflict' && key.hasIncrements) return undefined
  const local = new Map<number, number>()
  for (let p = 0; p < key.n; p++) local.set(key.operation[p], p)
  let margin: Margin = 'unbounded'
  for (const link of finding.links) {
    if (link.type === 'pair') margin = lesser(margin, pairMargin(counting, local, link))
  }
  return margin
}

function pairMargin(counting: Counting, local: ReadonlyMap<number, number>, link: Link): Margin {
  const { key, rule } = counting
  const { history } = key
  const [a, b] = [local.get(link.before)!, local.get(link.after)!]
  const gap = history.times.startNs(link.after) - history.times.endNs(link.before)
  const isDelayed = isWrite(key, a) && isRead(key, b) && !isWrite(key, b)
  const closing = isDelayed && rule.writeRead === 'closing' ? closingMargin(counting, b) : 'unbounded'
  if (key.client[a] === key.client[b] || key.host[a] === key.host[b]) return closing
  const delay = isDelayed && rule.writeRead === 'late' ? rule.withinNs! : 0n
  return lesser(closing, (gap - delay - 1n) / 2n)
}

/** Up to which clock error a read is still a closing one. */
function closingMargin({ key, rule }: Counting, read: number): Margin {
  const { times } = key.history
  const start = times.startNs(key.operation[read])
  let margin: Margin = 'unbounded'
  for (let w = 0; w < key.n; w++) {
    if (key.acked[w] === 0 || !isWrite(key, w)) continue
    if (key.client[w] === key.client[read] || key.host[w] === key.host[read]) continue
    const gap = start - times.endNs(key.operation[w])
    margin = lesser(margin, lesser((gap - 1n) / 2n, (gap - (rule.settleNs ?? 0n)) / 2n))
  }
  return margin
}

/** The largest clock error under which the read still crosses its bounds. */
function boundsMargin(counting: Counting, index: KeyIndex, finding: RawFinding): Margin {
  const { key, rule } = counting
  const { from } = finding.bounds!
  const localOf = (operation: number | undefined): number =>
    operation === undefined ? START : key.operation.indexOf(operation)
  const [q, r] = [localOf(from), localOf(finding.blamed)]
  return largest(key.clockErrorNs, (clockErrorNs) => {
    const gathered = gatherKey(key.history, index, key.keyId, clockErrorNs)
    const tallies = new Tallies(countPairs(gathered, rule), key.history.values)
    const [value, start] = [tallies.count(r)!, tallies.count(q)!]
    if (finding.links.length === 0 && q !== START && finding.kind === 'lost-increment') return true
    const { least, most, anySure } = tallies.bounds(q, r)
    if (finding.kind === 'lost-increment') {
      return value < start + least && (anySure || (tallies.hasDecreases && tallies.isBefore(q, r)))
    }
    if (finding.kind === 'repeated-increment') return value > start + most && tallies.isBefore(q, r)
    return tallies.isBefore(q, r)
  })
}

/**
 * The margin of a key that is broken under `clockErrorNs`. `known` is a margin that some evidence reaches: often the
 * answer, which one decision a nanosecond above it confirms.
 */
export function keyMargin(
  history: History,
  index: KeyIndex,
  keyId: number,
  rule: PairRule,
  clockErrorNs: bigint,
  known: Margin,
): Margin {
  if (known === 'unbounded') return known
  const isBroken = (error: bigint): boolean =>
    decideKey(gatherKey(history, index, keyId, error), history.values, rule).verdict === 'broken'
  return largest(known > clockErrorNs && isBroken(known) ? known : clockErrorNs, isBroken)
}

/** The largest clock error under which these operations are still broken by themselves. */
export function subsetMargin({ key, rule }: Counting, operations: Int32Array): Margin {
  return largest(key.clockErrorNs, (clockErrorNs) => {
    const part = gatherOperations(key.history, operations, key.keyId, clockErrorNs)
    return decideKey(part, key.history.values, rule, SMALL_BUDGET).verdict === 'broken'
  })
}

/** The largest number from `from` on for which a falling predicate, true at `from`, is true. Gallops, then bisects. */
function largest(from: bigint, holds: (n: bigint) => boolean): Margin {
  let low = from
  let step = 1n
  let high = low + step
  while (holds(high)) {
    if (high >= ANY_CLOCK) return 'unbounded'
    low = high
    step = step === 1n && holds(ANY_CLOCK) ? ANY_CLOCK : step * 4n
    high = low + step > ANY_CLOCK ? ANY_CLOCK : low + step
  }
  while (high - low > 1n) {
    const middle = (low + high) / 2n
    if (holds(middle)) low = middle
    else high = middle
  }
  return low
}
