/**
 * One promise on one key: which decider answers, by the kind of the key.
 */
import { NO_VALUE, NULL_VALUE, type Values } from '../history/columns.js'
import { type Counting, countPairs } from '../order/counting.js'
import { findCounts } from '../order/counts.js'
import type { KeyHistory } from '../order/key-history.js'
import { isWrite } from '../order/roles.js'
import { isUntested } from '../order/untested.js'
import { findVersions } from '../order/versions.js'
import { linearizable } from '../promises/linearizable.js'
import type { PairRule } from '../promises/promise.js'
import { decideCounter } from './counter.js'
import type { Decision } from './decision.js'
import { findLostUpdates } from './lost-updates.js'
import { decideRegister } from './register.js'
import { type Budget, DEFAULT_BUDGET, Purse } from './search/budget.js'
import { resolveReads } from './search/candidates.js'
import { search } from './search/search.js'
import { readsTooFarBehind } from './version-bound.js'

/** register: no increments; counter: increments and reads only; mixed: increments with writes, cas or deletes. */
export type KeyKind = 'register' | 'counter' | 'mixed'

/** What kind a key is goes by its records, whatever their outcome. */
export function kindOfKey(key: KeyHistory): KeyKind {
  if (!key.hasIncrements) return 'register'
  return key.hasWrites ? 'mixed' : 'counter'
}

/** Whether some read of a register key could have seen several writes, or the key mixes increments with writes. */
export function isAmbiguous(key: KeyHistory): boolean {
  return key.hasIncrements ? key.hasWrites : findVersions(key).ambiguous >= 0
}

/** Whether it may take a search to decide the key. */
export function isSearched(key: KeyHistory, values: Values): boolean {
  return (
    isAmbiguous(key) || (kindOfKey(key) === 'counter' && findCounts(key, values).trouble === 'several-sizes')
  )
}

/**
 * Decides whether the promise holds on the key. Never a guess: where the search meets the budget, `undecided`. With
 * values written once (and increments of one size) there is no search, and it costs O(n log n).
 */
export function decideKey(
  key: KeyHistory,
  values: Values,
  rule: PairRule,
  budget: Budget = DEFAULT_BUDGET,
): Decision {
  const steps = decideKeyInSteps(key, values, rule, new Purse(budget))
  for (;;) {
    const next = steps.next()
    if (next.done) return next.value
  }
}

/** As `decideKey`, for those who have other things to do: yields now and then while it searches. */
export function* decideKeyInSteps(
  key: KeyHistory,
  values: Values,
  rule: PairRule,
  purse: Purse,
): Generator<void, Decision> {
  if (key.hasIncrements && (rule.versions !== undefined || rule.name === 'no-lost-updates')) {
    return { verdict: 'left-out', reason: 'it means nothing on a key with increments' }
  }
  if (rule.name === 'no-lost-updates') {
    const { lost, updates } = findLostUpdates(key)
    return lost.length > 0 ? { verdict: 'broken' } : { verdict: 'holds', untested: updates === 0 }
  }
  const counting = countPairs(key, rule)
  const kind = kindOfKey(key)
  if (kind === 'register') {
    const { verdict } = decideByVersions(counting)
    if (verdict !== 'ambiguous') return told(verdict, counting)
  }
  if (kind === 'counter') {
    const { verdict } = decideCounter(counting, values)
    if (verdict !== 'several-sizes') return told(verdict, counting)
  }
  return yield* decideBySearch(counting, values, purse)
}

function told(verdict: 'holds' | 'broken', counting: Counting): Decision {
  return verdict === 'holds' ? { verdict, untested: isUntested(counting) } : { verdict }
}

/**
 * What the versions of a register key say, as far as precedence tells which write each read saw. `ambiguous`: the
 * search has to say. O(n log n).
 */
export function decideByVersions(counting: Counting): ByVersions {
  const { key } = counting
  const plain = verdictOf(counting)
  // Where the start is not known, absence may have been there before, whatever a delete writes later.
  if (key.initial === NO_VALUE)
    return { verdict: plain === 'holds' || !writesAbsence(key) ? plain : 'ambiguous' }
  if (plain !== 'ambiguous') return { verdict: plain }
  const { resolved, guessed } = resolveReads(counting)
  const known = verdictOf({ ...counting, resolved })
  if (known !== 'ambiguous') return { verdict: known, resolved }
  const guess = verdictOf({ ...counting, resolved: guessed })
  return guess === 'holds' ? { verdict: guess, resolved: guessed } : { verdict: 'ambiguous' }
}

export interface ByVersions {
  readonly verdict: 'holds' | 'broken' | 'ambiguous'
  /** what the ambiguous reads saw, where the verdict rests on it */
  readonly resolved?: Int32Array
}

/**
 * A register key whose versions show it broken, with what precedence resolves of its reads; undefined where only the
 * search can tell.
 */
export function resolvedAsBroken(counting: Counting): Counting | undefined {
  const { key } = counting
  const isBroken = verdictOf(counting) === 'broken'
  if (key.initial === NO_VALUE) return isBroken ? counting : undefined
  if (findVersions(key).ambiguous < 0) return isBroken ? counting : undefined
  const resolved = { ...counting, resolved: resolveReads(counting).resolved }
  return verdictOf(resolved) === 'broken' ? resolved : undefined
}

function verdictOf(counting: Counting): 'holds' | 'broken' | 'ambiguous' {
  const { verdict, versions } = decideRegister(counting)
  const bound = counting.rule.versions
  if (verdict === 'broken' || bound === undefined) return verdict
  return readsTooFarBehind(counting, versions, bound).length > 0 ? 'broken' : verdict
}

/** Whether absence was written, or offered: a read of it then does not tell whether the key began absent. */
export function writesAbsence(key: KeyHistory): boolean {
  return key.offered.has(NULL_VALUE) || key.value.some((value, p) => value === NULL_VALUE && isWrite(key, p))
}

function* decideBySearch(counting: Counting, values: Values, purse: Purse): Generator<void, Decision> {
  const { key, rule } = counting
  // An order that answers as one copy would in real time keeps every other promise.
  if (rule.name !== 'linearizable' && (yield* isLinearizable(key, values, purse)))
    return told('holds', counting)
  const outcome = yield* search(counting, values, purse)
  switch (outcome.found) {
    case 'order':
      return told('holds', counting)
    case 'none':
      return { verdict: 'broken' }
    default:
      return {
        verdict: 'undecided',
        reason: `${whySearch(counting)}, and the search met its budget`,
        progress: `${Math.floor((100 * outcome.step) / outcome.steps)}% of the key's operations placed, in ${outcome.kept} ways so far`,
      }
  }
}

/** Answers of one key's search for linearizable, which every promise asks first. */
const linearizableKeys = new WeakMap<KeyHistory, boolean>()

function* isLinearizable(key: KeyHistory, values: Values, purse: Purse): Generator<void, boolean> {
  const known = linearizableKeys.get(key)
  if (known !== undefined) return known
  const decision = yield* decideKeyInSteps(key, values, linearizable, purse)
  if (decision.verdict !== 'undecided') linearizableKeys.set(key, decision.verdict === 'holds')
  return decision.verdict === 'holds'
}

function whySearch({ key }: Counting): string {
  if (key.hasIncrements) {
    return key.hasWrites
      ? 'it mixes increments with writes, cas or deletes'
      : 'its increments are of several sizes'
  }
  return findVersions(key).ambiguous < 0
    ? 'its start is not known'
    : 'a value was written more than once, or a failed cas does not say what it saw'
}
