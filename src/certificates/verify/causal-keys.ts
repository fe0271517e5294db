/**
 * Which operations the promises over several keys speak of, and which write each of their reads saw.
 */
import { CAS, INCREMENT, NO_VALUE, READ } from '../../history/columns.js'
import type { Recorded } from './recorded.js'

export class CausalKeys {
  readonly recorded: Recorded
  /** acked operations, and unsure writes that were seen */
  readonly takesPart = new Set<number>()
  /** operation → the write that it read or found, -1 for the initial value */
  readonly source = new Map<number, number>()
  /** reads of what nobody wrote */
  readonly unwritten: number[] = []

  constructor(recorded: Recorded) {
    this.recorded = recorded
  }

  /** Takes a key in; false where it is not covered: a read could have seen several writes. `all`: refused ones too. */
  add(keyId: number, all: readonly number[]): boolean {
    const { recorded } = this
    const { kind } = recorded.history
    if (all.some((i) => kind[i] === INCREMENT)) return false
    const own = all.filter((i) => recorded.counts(i))
    const writers = new Map<number, number[]>()
    for (const w of own) {
      if (recorded.writes(w))
        writers.set(recorded.written(w), [...(writers.get(recorded.written(w)) ?? []), w])
    }
    const source = new Map<number, number>()
    const unwritten: number[] = []
    let start = this.#startOf(keyId, all, writers)
    const look = (i: number): boolean => {
      const value = recorded.found(i)
      const some = writers.get(value) ?? []
      if (value === NO_VALUE || some.length > 1 || (some.length === 1 && value === start)) return false
      if (some.length === 1) source.set(i, some[0])
      else if (value === start) source.set(i, -1)
      else unwritten.push(i)
      return true
    }
    for (const r of own) if (recorded.reads(r) && !look(r)) return false
    // No read tells an unknown start, but an unsure cas that took effect must have found it.
    const lookAsUnsure = (w: number): boolean => {
      const value = recorded.found(w)
      if (start === NO_VALUE && !writers.has(value) && !this.#isOffered(all, value)) start = value
      return look(w)
    }
    const effective = new Set(own.filter((i) => recorded.isAcked(i)))
    for (const seen of [...source.values()]) {
      for (let w = seen; w >= 0 && !effective.has(w); w = source.get(w) ?? -1) {
        effective.add(w)
        if (kind[w] === CAS && !lookAsUnsure(w)) return false
      }
    }
    for (const i of effective) if (!unwritten.includes(i)) this.takesPart.add(i)
    for (const [i, w] of source) this.source.set(i, w)
    this.unwritten.push(...unwritten)
    return true
  }

  /** Whether a refused write or a failed cas offered the value. */
  #isOffered(all: readonly number[], value: number): boolean {
    const { recorded } = this
    const { kind } = recorded.history
    return all.some(
      (i) =>
        kind[i] !== READ && (!recorded.counts(i) || !recorded.writes(i)) && recorded.written(i) === value,
    )
  }

  /** The value id that the key started with; an unknown start is the first value found that nobody wrote or offered. */
  #startOf(keyId: number, all: readonly number[], writers: ReadonlyMap<number, unknown>): number {
    const { recorded } = this
    const { initial, initialUnknown } = recorded.history
    const known = initial.get(keyId)
    if (known !== undefined || !initialUnknown) return known ?? 0
    const isFree = (value: number): boolean =>
      value !== NO_VALUE && !writers.has(value) && !this.#isOffered(all, value)
    const finders = all.filter((i) => recorded.reads(i))
    const first = finders.find((i) => isFree(recorded.found(i)))
    return first === undefined ? NO_VALUE : recorded.found(first)
  }
}
