/**
 * A key that a search found broken: the smallest set of its operations that no order explains, and what to call it.
 *
 * Nobody can be blamed by a chain of pairs here: several writes could be the one that a read saw, or several sums the
 * one that it returned. The evidence is the set itself; taking any operation of it away mends it.
 */
import { decideRegister } from '../deciders/register.js'
import { DEFAULT_BUDGET, Purse } from '../deciders/search/budget.js'
import { resolveReads } from '../deciders/search/candidates.js'
import { searchThrough } from '../deciders/search/search.js'
import { NO_VALUE, type Values } from '../history/columns.js'
import { type Counting, countPairs } from '../order/counting.js'
import { gatherOperations, type KeyHistory } from '../order/key-history.js'
import { isRead, isWrite } from '../order/roles.js'
import { closedSubsets } from './closed-subsets.js'
import { Judge } from './judge.js'
import type { FindingKind } from './kinds.js'
import { subsetMargin } from './margin.js'
import type { Exhibit, RawFinding } from './raw-finding.js'
import { findRegister } from './register/find.js'
import { shrink } from './shrink.js'
import { plural, Teller } from './telling.js'

/** Most findings of one key that are looked for one after the other. */
const MOST = 10

/** Operations before the one that got stuck that are tried first; twice as many each time they do not do. */
const WINDOW = 48

/**
 * The findings of a key that is broken by the search's word; at least one. `operations` are all of the key's operation
 * indices, refused ones too. After each finding, its blamed read is set aside
 * and what is left is decided again.
 */
export function findConflicts(counting: Counting, values: Values, operations: Int32Array): RawFinding[] {
  const findings: RawFinding[] = []
  let rest: KeyHistory | undefined = counting.key
  while (rest && findings.length < MOST) {
    const finding = findConflict(countPairs(rest, counting.rule), values, operations)
    if (!finding) break
    findings.push(finding)
    // Of conflicts without a kind of their own a key has one.
    if (finding.kind === 'order-conflict') break
    rest = without(rest, finding.blamed)
  }
  // Where no subset can be confirmed in the time that there is, the whole key is the evidence.
  return findings.length > 0 ? findings : [tellConflict(counting, Array.from(counting.key.operation))]
}

function without(key: KeyHistory, blamed: number): KeyHistory | undefined {
  const operations = key.operation.filter((i) => i !== blamed).sort()
  if (operations.length === key.n) return undefined
  return partOf(key, operations)
}

/** Some operations of a key, still the kind of key that it is. */
function partOf(key: KeyHistory, operations: Int32Array): KeyHistory {
  const part = gatherOperations(key.history, operations, key.keyId, key.clockErrorNs)
  const { offered, hasIncrements, hasWrites } = key
  return { ...part, offered, hasIncrements, hasWrites }
}

function findConflict(counting: Counting, values: Values, all: Int32Array): RawFinding | undefined {
  const conflict = smallestConflict(counting, values)
  if (!conflict) return undefined
  const named = nameByVersions(counting, values, conflict, all) ?? tellConflict(counting, conflict)
  return { ...named, margin: subsetMargin(counting, Int32Array.from(conflict)) }
}

/** Operations that are broken by themselves and irreducibly so, in input order, or undefined. */
function smallestConflict(counting: Counting, values: Values): number[] | undefined {
  const { key } = counting
  const outcome = searchThrough(counting, values, new Purse(DEFAULT_BUDGET))
  if (outcome.found !== 'none') return undefined
  const judge = new Judge(counting, values)
  const dependents = closedSubsets(counting, values)
  const until = key.sureEnd[outcome.stuckAt]
  let last = key.n
  while (last > 0 && key.start[last - 1] > until) last--
  for (let size = WINDOW; ; size *= 2) {
    const kept = new Set(key.operation.subarray(Math.max(0, last - size), last))
    const gone = Array.from(key.operation).filter((i) => !kept.has(i))
    for (let i = gone.pop(); i !== undefined; i = gone.pop())
      for (const other of dependents(i, kept)) if (kept.delete(other)) gone.push(other)
    if (kept.size > 0 && judge.isBroken(kept))
      return shrink([...kept], (rest) => judge.isBroken(rest), dependents)
    if (size >= last) break
  }
  const everything = Array.from(key.operation).sort((a, b) => a - b)
  return judge.isBroken(everything)
    ? shrink(everything, (rest) => judge.isBroken(rest), dependents)
    : undefined
}

/** The finding by the decision list, where in this subset only one write is left for every read. */
function nameByVersions(
  counting: Counting,
  values: Values,
  conflict: readonly number[],
  all: Int32Array,
): RawFinding | undefined {
  const { key, rule } = counting
  if (key.hasIncrements || key.initial === NO_VALUE) return undefined
  const plain = countPairs(partOf(key, Int32Array.from(conflict)), rule)
  const { resolved, isComplete } = resolveReads(plain)
  const resolvedCounting = { ...plain, resolved }
  if (!isComplete || decideRegister(resolvedCounting).verdict !== 'broken') return undefined
  return findRegister(resolvedCounting, values, all)[0]
}

function tellConflict({ key }: Counting, operations: readonly number[]): RawFinding {
  const tell = new Teller(key)
  const among = new Set(operations)
  const locals: number[] = []
  for (let p = 0; p < key.n; p++) if (among.has(key.operation[p])) locals.push(p)
  const blamed = locals.findLast((p) => isRead(key, p)) ?? locals[locals.length - 1]
  const exhibits = locals.map(
    (p): Exhibit => ({
      operation: key.operation[p],
      role: p === blamed ? 'the last read of them' : isWrite(key, p) ? 'one of the writes' : 'a read',
    }),
  )
  const kind: FindingKind = 'order-conflict'
  return {
    kind,
    also: [],
    keyId: key.keyId,
    blamed: key.operation[blamed],
    cause: -1,
    exhibits,
    links: [],
    summary: `No order of ${plural(locals.length, 'operation')} on ${tell.keyName} answers as they were answered, whichever write each read saw; without any one of them there is one.`,
  }
}
