/**
 * Whether subsets of a key's operations are broken by themselves: the decider, asked again and again.
 */
import { decideKey } from '../deciders/decide-key.js'
import { SMALL_BUDGET } from '../deciders/search/budget.js'
import { INCREMENT, type Values } from '../history/columns.js'
import { type Counting, countPairs, counts } from '../order/counting.js'
import { gatherOperations, type KeyHistory } from '../order/key-history.js'
import { WithExtraValue } from './with-extra-value.js'

/** Decides subsets of one key under one promise. */
export class Judge {
  readonly counting: Counting
  readonly key: KeyHistory
  values: Values
  readonly #own: Values
  readonly #local: Map<number, number>
  #initial: number | undefined

  constructor(counting: Counting, values: Values) {
    this.counting = counting
    this.key = counting.key
    this.values = values
    this.#own = values
    this.#local = new Map(Array.from(this.key.operation, (i, p) => [i, p]))
  }

  localOf(operation: number): number {
    return this.#local.get(operation) ?? -1
  }

  /** Sets the count that subsets start from; undefined: the key's own initial value. */
  start(initialCount: bigint | undefined): void {
    if (initialCount === undefined) {
      this.values = this.#own
      this.#initial = undefined
      return
    }
    const extended = new WithExtraValue(this.#own, initialCount.toString())
    this.values = extended
    this.#initial = extended.extraId
  }

  isBroken(operations: Iterable<number>): boolean {
    const sorted = Int32Array.from(operations).sort()
    const part = gatherOperations(this.key.history, sorted, this.key.keyId, this.key.clockErrorNs)
    const alone = this.#initial === undefined ? part : { ...part, initial: this.#initial }
    if (!this.#isBrokenKey(alone)) return false
    // What kind a key is goes by all of its records: a part must be broken as what the whole is, too.
    const { hasIncrements, hasWrites } = this.key
    if (alone.hasIncrements === hasIncrements && alone.hasWrites === hasWrites) return true
    return this.#isBrokenKey({ ...alone, hasIncrements, hasWrites })
  }

  #isBrokenKey(key: KeyHistory): boolean {
    // Which reads are closing ones, the whole key says.
    const { closing } = this.counting
    if (closing) {
      const own = countPairs(key, this.counting.rule).closing!
      for (let p = 0; p < key.n; p++)
        if (own[p] === 1 && closing[this.localOf(key.operation[p])] === 0) return false
    }
    return decideKey(key, this.values, this.counting.rule, SMALL_BUDGET).verdict === 'broken'
  }

  /** The first increment that does not certainly come before local read `q`, or -1. */
  incrementNotBefore(q: number): number {
    const { key } = this
    for (let i = 0; i < key.n; i++) {
      if (key.kind[i] === INCREMENT && i !== q && !counts(this.counting, i, 'write', q, 'read'))
        return key.operation[i]
    }
    return -1
  }
}
