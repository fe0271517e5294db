/**
 * Sums of increments between two reads of a counter key (findings.md, "Counters"), exact and by definition.
 */
import { INCREMENT, type Values } from '../../history/columns.js'
import { type Counting, counts } from '../../order/counting.js'
import { countOf, sizeOf } from '../../order/counts.js'
import type { KeyHistory } from '../../order/key-history.js'
import { precedes } from '../../order/precedence.js'
import { isRead } from '../../order/roles.js'

/** Stands for the start of the history where a read is asked for. */
export const START = -1

export class Tallies {
  readonly counting: Counting
  readonly key: KeyHistory
  /** local indices of the increments */
  readonly increments: readonly number[]
  readonly hasDecreases: boolean
  /** local index → size, exact; undefined elsewhere */
  readonly #size: (bigint | undefined)[]
  readonly #values: Values

  constructor(counting: Counting, values: Values) {
    this.counting = counting
    this.key = counting.key
    this.#values = values
    const increments: number[] = []
    this.#size = new Array(this.key.n)
    let hasDecreases = false
    for (let p = 0; p < this.key.n; p++) {
      if (this.key.kind[p] !== INCREMENT) continue
      increments.push(p)
      const size = sizeOf(this.key, values, p)
      this.#size[p] = size
      if (size < 0n) hasDecreases = true
    }
    this.increments = increments
    this.hasDecreases = hasDecreases
  }

  size(p: number): bigint {
    return this.#size[p]!
  }

  /** The count that a read returned, or the initial one at START; undefined when it is no number or unknown. */
  count(read: number): bigint | undefined {
    return countOf(this.#values, read === START ? this.key.initial : this.key.value[read])
  }

  /** Whether increment `i` certainly lies between: q ≺ i ≺ r, where r's own increment counts as before r. */
  surelyBetween(q: number, i: number, r: number): boolean {
    if (this.key.acked[i] === 0 || i === q) return false
    // Nobody reads the future: a read comes before the increments that it precedes under every promise.
    const afterStart = q === START || precedes(this.key, q, i)
    if (i === r) return afterStart
    return afterStart && counts(this.counting, i, 'write', r, 'read')
  }

  /** Whether increment `i` could lie between: neither i ≺ q nor r ≺ i. */
  maybeBetween(q: number, i: number, r: number): boolean {
    if (i === q) return false
    if (i === r) return true
    if (precedes(this.key, r, i)) return false
    return q === START || !counts(this.counting, i, 'write', q, 'read')
  }

  /** Least and most that the increments between q and r allow. O(increments). */
  bounds(q: number, r: number): { least: bigint; most: bigint; anySure: boolean } {
    let least = 0n
    let most = 0n
    let anySure = false
    for (const i of this.increments) {
      const size = this.size(i)
      if (size > 0n) {
        if (this.surelyBetween(q, i, r)) {
          least += size
          anySure = true
        }
        if (this.maybeBetween(q, i, r)) most += size
      } else if (size < 0n) {
        if (this.maybeBetween(q, i, r)) least += size
        if (this.surelyBetween(q, i, r)) most += size
      }
    }
    return { least, most, anySure }
  }

  /** Whether q certainly comes before r in any order that explains both. */
  isBefore(q: number, r: number): boolean {
    if (q === START || counts(this.counting, q, 'read', r, 'read')) return true
    return !this.hasDecreases && this.count(q)! < this.count(r)!
  }

  reads(): number[] {
    const reads: number[] = []
    for (let p = 0; p < this.key.n; p++) if (isRead(this.key, p)) reads.push(p)
    return reads
  }
}
