/**
 * A single copy of one key, used by one client at a time: what it holds, and whether it answers as recorded.
 */
import { CAS, INCREMENT, NO_VALUE, NULL_VALUE, READ } from '../../history/columns.js'
import type { Recorded } from './recorded.js'

export type Held =
  /** a whole number; on a key with increments absence is 0 */
  | { readonly is: 'number'; readonly count: bigint }
  /** value id */
  | { readonly is: 'value'; readonly value: number }
  /** what nobody knows: it is none of `not`; `plus` was added to it, if anything was it is a number */
  | { readonly is: 'start'; readonly plus: bigint; readonly added: boolean; readonly not: readonly string[] }

export class Copy {
  readonly #recorded: Recorded
  readonly #hasIncrements: boolean
  readonly #keyId: number
  /** values that somebody wrote or offered: no unknown start is one of them, absence apart */
  readonly #given: ReadonlySet<number>

  /** `all`: every operation of the key, refused ones too. */
  constructor(recorded: Recorded, keyId: number, all: readonly number[]) {
    this.#recorded = recorded
    this.#keyId = keyId
    const { kind } = recorded.history
    this.#hasIncrements = all.some((i) => kind[i] === INCREMENT)
    this.#given = new Set(
      all.filter((i) => kind[i] !== READ && kind[i] !== INCREMENT).map((i) => recorded.written(i)),
    )
  }

  start(): Held {
    const { initial, initialUnknown } = this.#recorded.history
    const known = initial.get(this.#keyId)
    if (known !== undefined) return this.#hold(known)
    return initialUnknown ? { is: 'start', plus: 0n, added: false, not: [] } : this.#hold(NULL_VALUE)
  }

  /** What is held after operation i, undefined where it could not have been answered so. */
  after(held: Held, i: number): Held | undefined {
    const { kind, extra, value, values } = this.#recorded.history
    if (kind[i] === INCREMENT) {
      if (held.is === 'value') return undefined
      const by = values.integer(extra[i])!
      const sum: Held =
        held.is === 'number'
          ? { is: 'number', count: held.count + by }
          : { ...held, plus: held.plus + by, added: true }
      return this.#recorded.reads(i) ? this.#meet(sum, value[i]) : sum
    }
    if (this.#recorded.writes(i)) {
      if (kind[i] === CAS && !this.#meet(held, extra[i])) return undefined
      return this.#hold(this.#recorded.written(i))
    }
    const found = this.#recorded.found(i)
    return found === NO_VALUE ? this.#miss(held, extra[i]) : this.#meet(held, found)
  }

  /** Two states with one name answer everything alike. */
  name(held: Held): string {
    if (held.is === 'number') return `n${held.count}`
    return held.is === 'value' ? `v${held.value}` : `s${held.plus}${held.added}${held.not.join()}`
  }

  #hold(value: number): Held {
    if (!this.#hasIncrements) return { is: 'value', value }
    if (value === NULL_VALUE) return { is: 'number', count: 0n }
    const count = this.#recorded.history.values.integer(value)
    return count === undefined ? { is: 'value', value } : { is: 'number', count }
  }

  /** What is held, now that it is known to be this value; undefined where it is not. */
  #meet(held: Held, value: number): Held | undefined {
    const told = this.#hold(value)
    if (held.is !== 'start') return this.name(held) === this.name(told) ? held : undefined
    if (told.is === 'number') {
      return held.not.includes(`n${told.count - held.plus}`) ? undefined : told
    }
    if (held.added || held.not.includes(this.name(told))) return undefined
    // With increments a start is free; else it is the one value that nobody wrote, or absence.
    return this.#hasIncrements || value === NULL_VALUE || !this.#given.has(value) ? told : undefined
  }

  /** What is held, now that it is known not to be this value; undefined where it is. */
  #miss(held: Held, value: number): Held | undefined {
    const other = this.#hold(value)
    if (held.is !== 'start') return this.name(held) === this.name(other) ? undefined : held
    const not = other.is === 'number' ? `n${other.count - held.plus}` : this.name(other)
    return { ...held, not: [...new Set([...held.not, not])].sort() }
  }
}
