/**
 * Makes the lines of a certificate out of what a check decides, key by key.
 */
import { decideCausal } from '../deciders/causal/decide.js'
import { type Budget, DEFAULT_BUDGET, Purse } from '../deciders/search/budget.js'
import { witness } from '../deciders/witness.js'
import { findCausalCounterexample } from '../findings/causal-counterexample.js'
import { findClosedConflict } from '../findings/counterexample.js'
import type { RawFinding } from '../findings/raw-finding.js'
import type { DecidedPromise } from '../findings/run.js'
import type { History } from '../history/columns.js'
import { countPairs } from '../order/counting.js'
import type { KeyHistory, KeyIndex } from '../order/key-history.js'
import { keyGlob } from '../promises/glob.js'
import type { CausalPromiseRequest, KeyPromiseRequest, PromiseRequest } from '../promises/request.js'
import { VERSION } from '../version.js'
import { causalOrder } from './causal-order.js'
import type { ClaimLine, HeaderLine } from './schema.js'

/** The header. `sha256` of each input, in the order in which they were read. */
export function headerLine(
  history: History,
  promises: readonly PromiseRequest[],
  clockErrorNs: bigint,
  sha256: readonly string[],
  onlyKeys?: readonly string[],
): HeaderLine {
  return {
    certificate: 1,
    misread: VERSION,
    inputs: history.files.map(({ name }, i) => ({ file: name, sha256: sha256[i] })),
    operations: history.count,
    clockErrorNs: clockErrorNs.toString(),
    ...(onlyKeys ? { onlyKeys: [...onlyKeys] } : {}),
    promises: promises.map(({ name, keys, rule, causal }) => ({
      name,
      promise: causal ?? rule.name,
      keys,
      ...(rule?.withinNs === undefined ? {} : { withinNs: rule.withinNs.toString() }),
      ...(rule?.settleNs === undefined ? {} : { settleNs: rule.settleNs.toString() }),
      ...(rule?.versions === undefined ? {} : { versions: rule.versions }),
    })),
  }
}

/** The claims about one key. Promises that one order proves share a line. */
export function keyClaims(
  key: KeyHistory,
  decided: readonly DecidedPromise[],
  newBudget: () => Budget = () => DEFAULT_BUDGET,
): ClaimLine[] {
  const name = key.history.keys.name(key.keyId)
  const claims: ClaimLine[] = []
  const held = new Map<string, { order: number[]; promises: string[] }>()
  const purse = new Purse(newBudget())
  for (const { promise, decision, found } of decided) {
    const about = { key: name, promises: [promise.name] }
    if (decision.verdict === 'left-out') claims.push({ claim: 'left-out', ...about })
    else if (decision.verdict === 'undecided') claims.push({ claim: 'undecided', ...about })
    else if (promise.rule.name === 'no-lost-updates') claims.push({ claim: decision.verdict, ...about })
    else if (decision.verdict === 'broken') claims.push(brokenClaim(key, promise, found, about))
    else {
      const order = witness(key, key.history.values, promise.rule, purse)
      if (!order) {
        claims.push({ claim: 'undecided', ...about })
        continue
      }
      const text = order.join()
      const same = held.get(text)
      if (same) same.promises.push(promise.name)
      else held.set(text, { order, promises: [promise.name] })
    }
  }
  for (const { order, promises } of held.values())
    claims.push({ claim: 'holds', key: name, promises, order: order.map((p) => key.operation[p]) })
  return claims
}

/** The shortest proof that there is: two counts that cannot both be, or the smallest counterexample. */
function brokenClaim(
  key: KeyHistory,
  { rule }: KeyPromiseRequest,
  found: readonly RawFinding[],
  about: { key: string; promises: string[] },
): ClaimLine {
  const counting = countPairs(key, rule)
  const bounded = found.find(({ bounds }) => bounds !== undefined)
  if (bounded) {
    const { from } = bounded.bounds!
    return {
      claim: 'broken',
      ...about,
      bounds: { ...(from === undefined ? {} : { from }), to: bounded.blamed },
    }
  }
  let shortest: readonly number[] | undefined
  for (const finding of found.slice(0, MOST_TRIED)) {
    const conflict = findClosedConflict(counting, key.history.values, finding)
    if (conflict && (!shortest || conflict.length < shortest.length)) shortest = conflict
  }
  return { claim: 'broken', ...about, counterexample: [...(shortest ?? key.operation)] }
}

/** Findings of a key whose counterexamples are compared. */
const MOST_TRIED = 5

/** The claim about a promise over all keys. */
export function causalClaim(
  history: History,
  index: KeyIndex,
  { name, causal, keys }: CausalPromiseRequest,
  onlyKeys: readonly string[] | undefined,
  found: readonly RawFinding[],
): ClaimLine {
  const matches = keyGlob(keys)
  const only = onlyKeys?.map(keyGlob)
  const isWanted = (keyId: number): boolean => {
    const key = history.keys.name(keyId)
    return matches(key) && (!only || only.some((wanted) => wanted(key)))
  }
  const outcome = decideCausal(history, index, causal, isWanted)
  if (outcome.verdict === 'undecided') return { claim: 'undecided', promises: [name] }
  const covered = new Set(outcome.causal.keyIds)
  const leftOut: string[] = []
  for (let keyId = 0; keyId + 1 < index.offset.length; keyId++) {
    const isUsed = index.offset[keyId] < index.offset[keyId + 1]
    if (isUsed && isWanted(keyId) && !covered.has(keyId)) leftOut.push(history.keys.name(keyId))
  }
  const about = { promises: [name], ...(leftOut.length > 0 ? { leftOut } : {}) }
  if (outcome.verdict === 'holds') return { claim: 'holds', ...about, order: causalOrder(outcome) }
  for (const finding of found) {
    const example = findCausalCounterexample(history, causal, finding)
    if (example) return { claim: 'broken', ...about, counterexample: [...example.operations] }
  }
  // A value that nobody wrote, where the start is not known: the whole key says which one it is.
  const { offset, operations } = index
  const keyIds = found[0].keyIds ?? [found[0].keyId]
  const whole = keyIds.flatMap((keyId) => [...operations.subarray(offset[keyId], offset[keyId + 1])])
  return { claim: 'broken', ...about, counterexample: whole }
}
