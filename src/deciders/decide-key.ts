/**
 * One promise on one key: which decider answers, by the kind of the key.
 */
import type { Values } from '../history/columns.js'
import { countPairs } from '../order/counting.js'
import type { KeyHistory } from '../order/key-history.js'
import { isUntested } from '../order/untested.js'
import type { PairRule } from '../promises/promise.js'
import { isBrokenWithoutAbsence, mayHaveBegunAbsent } from './absent-start.js'
import { decideCounter } from './counter.js'
import type { Decision } from './decision.js'
import { findLostUpdates } from './lost-updates.js'
import { ambiguityReason, decideRegister } from './register.js'
import { readsTooFarBehind } from './version-bound.js'

const UNKNOWN_START = 'the start is not known: a read of absence could have seen it, or what a delete left'

/** register: no increments; counter: increments and reads only; mixed: increments with writes, cas or deletes. */
export type KeyKind = 'register' | 'counter' | 'mixed'

/** What kind a key is goes by its records, whatever their outcome. */
export function kindOfKey(key: KeyHistory): KeyKind {
  if (!key.hasIncrements) return 'register'
  return key.hasWrites ? 'mixed' : 'counter'
}

/** Decides whether the promise holds on the key. Never a guess: what no decider settles is `undecided`. */
export function decideKey(key: KeyHistory, values: Values, rule: PairRule): Decision {
  const { versions: bound } = rule
  if (key.hasIncrements && (bound !== undefined || rule.name === 'no-lost-updates')) {
    return { verdict: 'left-out', reason: 'it means nothing on a key with increments' }
  }
  if (rule.name === 'no-lost-updates') {
    const { lost, updates } = findLostUpdates(key)
    return lost.length > 0 ? { verdict: 'broken' } : { verdict: 'holds', untested: updates === 0 }
  }
  const counting = countPairs(key, rule)
  switch (kindOfKey(key)) {
    case 'register': {
      const outcome = decideRegister(counting)
      if (outcome.verdict === 'broken') {
        return mayHaveBegunAbsent(key, outcome.versions) &&
          !isBrokenWithoutAbsence(key, (rest) => decideKey(rest, values, rule).verdict === 'broken')
          ? { verdict: 'undecided', reason: UNKNOWN_START }
          : { verdict: 'broken' }
      }
      if (outcome.verdict === 'ambiguous') {
        return { verdict: 'undecided', reason: ambiguityReason(counting, outcome.versions) }
      }
      if (bound !== undefined && readsTooFarBehind(counting, outcome.versions, bound).length > 0) {
        return mayHaveBegunAbsent(key, outcome.versions)
          ? { verdict: 'undecided', reason: UNKNOWN_START }
          : { verdict: 'broken' }
      }
      return { verdict: 'holds', untested: isUntested(counting) }
    }
    case 'counter': {
      const outcome = decideCounter(counting, values)
      if (outcome.verdict === 'broken') return { verdict: 'broken' }
      if (outcome.verdict === 'several-sizes') {
        return { verdict: 'undecided', reason: 'its increments are of several sizes' }
      }
      return { verdict: 'holds', untested: isUntested(counting) }
    }
    case 'mixed':
      return { verdict: 'undecided', reason: 'it mixes increments with writes, cas or deletes' }
  }
}
