/**
 * The smallest set of operations that breaks a causal promise alone.
 */
import { decideCausal } from '../deciders/causal/decide.js'
import { ACKED, CAS, type History, NO_VALUE, READ, REFUSED } from '../history/columns.js'
import type { KeyIndex } from '../order/key-history.js'
import type { CausalName } from '../promises/request.js'
import type { Counterexample } from './counterexample.js'
import type { RawFinding } from './raw-finding.js'
import { shrink } from './shrink.js'

/** The counterexample of a causal finding, irreducible, or undefined when its evidence alone is not broken. */
export function findCausalCounterexample(
  history: History,
  promise: CausalName,
  { exhibits, blamed, kind }: RawFinding,
): Counterexample | undefined {
  const isBroken = (operations: Iterable<number>): boolean =>
    decideCausal(history, subsetIndex(history, operations), promise, () => true).verdict === 'broken'
  const evidence = withSources(
    history,
    exhibits.map(({ operation }) => operation),
  )
  if (!isBroken(evidence)) return undefined
  const { causal } = decideCausal(history, subsetIndex(history, evidence), promise, () => true)
  /** With a write go its reads and the cas that found it; a torn or refused value goes with any of its sources. */
  function* dependents(removed: number): Generator<number> {
    for (let node = 0; node < causal.count; node++) {
      if (causal.from[node] >= 0 && causal.operation[causal.from[node]] === removed)
        yield causal.operation[node]
    }
    if ((kind === 'torn-row' || kind === 'refused-write-seen') && removed !== blamed) yield blamed
  }
  return { operations: shrink(evidence, isBroken, dependents), initialCount: undefined }
}

/** Adds what they read or found was written by, and so on: what a cas found belongs to it. O(n · operations). */
function withSources(history: History, operations: readonly number[]): number[] {
  const { count, kind, outcome, applied, key, value, extra, saw } = history
  const kept = new Set(operations)
  for (const i of kept) {
    const failed = kind[i] === CAS && outcome[i] === ACKED && applied[i] === 0
    const wanted =
      kind[i] === READ ? value[i] : kind[i] !== CAS ? NO_VALUE : failed ? (saw?.[i] ?? NO_VALUE) : extra[i]
    if (wanted === NO_VALUE) continue
    for (let w = 0; w < count; w++) {
      const writes = kind[w] !== READ && !(kind[w] === CAS && outcome[w] === ACKED && applied[w] === 0)
      // A set visits what is added while it is walked.
      if (key[w] === key[i] && writes && outcome[w] !== REFUSED && value[w] === wanted) kept.add(w)
    }
  }
  return [...kept]
}

/** An index over some operations only. */
function subsetIndex(history: History, operations: Iterable<number>): KeyIndex {
  const sorted = Int32Array.from(operations).sort((a, b) => history.key[a] - history.key[b] || a - b)
  const offset = new Int32Array(history.keys.size + 1)
  for (const i of sorted) offset[history.key[i] + 1]++
  for (let k = 0; k < history.keys.size; k++) offset[k + 1] += offset[k]
  return { offset, operations: sorted, columns: undefined }
}
