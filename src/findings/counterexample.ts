/**
 * The smallest set of operations that breaks a promise alone.
 *
 * Starts from a finding's evidence (from the whole key where the evidence does not do) and takes away what it can
 * (Zeller and Hildebrandt 2002, on closed subsets): an operation goes together with what depends on it, and what
 * is left must still be broken by the decider's word; an undecided rest counts as mended.
 */

import { isAmbiguous } from '../deciders/decide-key.js'
import { INCREMENT, type Values } from '../history/columns.js'
import type { Counting } from '../order/counting.js'
import { sizeOf } from '../order/counts.js'
import type { KeyHistory } from '../order/key-history.js'
import { precedes } from '../order/precedence.js'
import { isRead } from '../order/roles.js'
import { findVersions } from '../order/versions.js'
import { closedOver, closedSubsets } from './closed-subsets.js'
import { Judge } from './judge.js'
import type { RawFinding } from './raw-finding.js'
import { type Dependents, shrink } from './shrink.js'

export interface Counterexample {
  /** operation indices in input order */
  readonly operations: readonly number[]
  /** a counter's count at its starting read, for the header's `initial`; undefined: the key's own initial value */
  readonly initialCount: bigint | undefined
}

/** The counterexample of a finding, irreducible, or undefined when no subset could be confirmed as broken. */
export function findCounterexample(
  counting: Counting,
  values: Values,
  finding: RawFinding,
): Counterexample | undefined {
  const judge = new Judge(counting, values)
  if (counting.rule.name !== 'no-lost-updates' && isAmbiguous(counting.key)) {
    const operations = findClosedConflict(counting, values, finding)
    return operations && { operations, initialCount: undefined }
  }
  if (counting.key.hasIncrements) return counterCounterexample(judge, finding)
  const dependents = registerDependents(counting, finding)
  // A cas that is shown for what it wrote found something, too.
  const shown = finding.exhibits.map(({ operation }) => operation)
  const evidence = new Set([...shown, ...closedOver(counting, values, shown)])
  const start = judge.isBroken(evidence) ? [...evidence] : everything(counting.key)
  if (!judge.isBroken(start)) return undefined
  return { operations: shrink(start, (rest) => judge.isBroken(rest), dependents), initialCount: undefined }
}

/**
 * Operations that are broken by themselves, irreducibly, with all that may explain their reads among them: what is left
 * out cannot matter. Undefined where no such set was confirmed. For keys of all kinds; a counter's may be large.
 */
export function findClosedConflict(
  counting: Counting,
  values: Values,
  finding: RawFinding,
): readonly number[] | undefined {
  const judge = new Judge(counting, values)
  const shown = finding.exhibits.map(({ operation }) => operation)
  const evidence = closedOver(counting, values, shown)
  const start = judge.isBroken(evidence) ? [...evidence] : everything(counting.key)
  if (start.length > MOST_SHRUNK || !judge.isBroken(start)) return undefined
  return shrink(start, (rest) => judge.isBroken(rest), closedSubsets(counting, values))
}

/** Larger sets than this are not worth what shrinking them costs. */
const MOST_SHRUNK = 1000

function counterCounterexample(judge: Judge, finding: RawFinding): Counterexample | undefined {
  const { key } = judge
  const evidence = finding.exhibits.map(({ operation }) => operation)
  const { from, fromCount } = finding.bounds ?? {}
  const attempts: { operations: number[]; starting: number; initialCount: bigint | undefined }[] = []
  if (from === undefined) {
    attempts.push({ operations: evidence, starting: -1, initialCount: undefined })
  } else {
    const p = judge.localOf(from)
    const own = key.kind[p] === INCREMENT ? sizeOf(key, judge.values, p) : 0n
    const at = { starting: from, initialCount: fromCount! - own }
    if (finding.kind === 'backward-counter') {
      const inFlight = judge.incrementNotBefore(p)
      if (inFlight >= 0) attempts.push({ ...at, operations: [...evidence, inFlight] })
    }
    attempts.push({ ...at, operations: evidence })
  }
  attempts.push({ operations: everything(key), starting: -1, initialCount: undefined })
  for (const { operations, starting, initialCount } of attempts) {
    judge.start(initialCount)
    if (!judge.isBroken(operations)) continue
    return {
      operations: shrink(
        operations,
        (rest) => judge.isBroken(rest),
        counterDependents(judge, starting),
        starting,
      ),
      initialCount,
    }
  }
  return undefined
}

function everything(key: KeyHistory): number[] {
  return Array.from(key.operation).sort((a, b) => a - b)
}

/** With a write go its reads and the cas that found it; a torn or refused value goes with any of its sources. */
function registerDependents(counting: Counting, finding: RawFinding): Dependents {
  const { key } = counting
  const versions = findVersions(key, counting.resolved)
  const dependents = new Map<number, number[]>()
  const add = (write: number, other: number): void => {
    const others = dependents.get(write)
    if (others) others.push(other)
    else dependents.set(write, [other])
  }
  for (let p = 0; p < key.n; p++) {
    const seen = versions.readOf[p]
    if (seen > 0) add(key.operation[versions.writer[seen]], key.operation[p])
    const found = versions.writeOf[p] > 0 ? versions.found[versions.writeOf[p]] : -1
    if (found > 0 && found !== seen) add(key.operation[versions.writer[found]], key.operation[p])
  }
  if (finding.kind === 'torn-row' || finding.kind === 'refused-write-seen') {
    for (const { operation } of finding.exhibits)
      if (operation !== finding.blamed) add(operation, finding.blamed)
  }
  return (removed) => dependents.get(removed) ?? []
}

/** With an increment go all reads that may include it; the starting read stays. */
function counterDependents(judge: Judge, starting: number): Dependents {
  const { key } = judge
  return function* (removed, among) {
    const i = judge.localOf(removed)
    if (key.kind[i] !== INCREMENT) return
    for (const other of among) {
      const r = judge.localOf(other)
      if (other === starting || !isRead(key, r)) continue
      if (!precedes(key, r, i)) yield other
    }
  }
}
