/**
 * Placing one write in one configuration: what has to be hidden before it, what may be thought of as hidden from then
 * on, and what no longer may.
 */
import { bitIndex, type Configuration, isOpen } from './configurations.js'
import type { Flight } from './flight.js'
import { IMPOSSIBLE, type Machine } from './machine.js'

export class Placing {
  /** slots that the last question found to be placed, or hidden for good, along with an operation */
  readonly commit: Int32Array
  readonly #flight: Flight
  readonly #machine: Machine
  readonly #words: number
  readonly #eligible: Int32Array

  constructor(flight: Flight, machine: Machine) {
    this.#flight = flight
    this.#machine = machine
    this.#words = flight.words
    this.commit = new Int32Array(flight.words)
    this.#eligible = new Int32Array(flight.words)
  }

  /**
   * Places a write. False: something must come before it, or the copy could not have answered so. `staysOpen`: it is one
   * of writes without end, and may be placed again.
   */
  place(one: Configuration, w: number, staysOpen: boolean): boolean {
    const state = this.#machine.after(one.state, w)
    if (state === IMPOSSIBLE) return false
    const words = this.#words
    const { hideable, slotOf, related, relations } = this.#flight
    const isBlind = this.#machine.isBlind(w)
    const commit = this.commit
    commit.fill(0)
    const eligible = this.#eligible
    if (isBlind) this.#findEligible(one, w)
    if ((relations > 0 || related[w] === 1) && !this.#collect(one, w, isBlind ? eligible : undefined))
      return false
    const slot = slotOf[w]
    if (slot >= 0 && !staysOpen) commit[slot >> 5] |= 1 << (slot & 31)
    this.take(one)
    // Whatever could have been hidden before it may be thought of as hidden from now on.
    if (isBlind) for (let b = 0; b < words; b++) one.bits[words + b] &= ~(eligible[b] & hideable[b])
    one.state = state
    if (relations > 0) this.#delay(one, w)
    return true
  }

  /** What must come after a write that shows, or after one that is late, cannot be hidden before the last blind write. */
  #delay(one: Configuration, shown: number): void {
    const { slotOf, writes } = this.#flight
    const words = this.#words
    for (const other of writes) {
      const before = this.#flight.before(other)
      if (!before || !isOpen(one, slotOf[other])) continue
      let isLate = slotOf[shown] >= 0 && (before[slotOf[shown] >> 5] & (1 << (slotOf[shown] & 31))) !== 0
      for (let b = 0; b < words && !isLate; b++) isLate = (before[b] & one.bits[words + b]) !== 0
      if (isLate) one.bits[words + (slotOf[other] >> 5)] |= 1 << (slotOf[other] & 31)
    }
  }

  /** Which open writes could stand directly before blind write `w`. */
  #findEligible(one: Configuration, w: number): void {
    const { hideable, slotOf, writes, relations } = this.#flight
    const eligible = this.#eligible
    if (relations === 0) {
      for (let b = 0; b < this.#words; b++) eligible[b] = one.bits[b] & hideable[b]
      if (slotOf[w] >= 0) eligible[slotOf[w] >> 5] &= ~(1 << (slotOf[w] & 31))
      return
    }
    eligible.fill(0)
    for (const other of writes) {
      const slot = slotOf[other]
      const [word, bit] = [slot >> 5, 1 << (slot & 31)]
      if (other === w || (hideable[word] & bit) === 0 || (one.bits[word] & bit) === 0) continue
      const before = this.#flight.before(other)
      let fits = true
      if (before) {
        for (let b = 0; b < this.#words && fits; b++) {
          if ((before[b] & one.bits[b] & ~(eligible[b] | this.free(one, b))) !== 0) fits = false
        }
      }
      if (fits) eligible[word] |= bit
    }
  }

  /** Puts into `commit` the free writes that must be hidden before `p` is placed; false where something open cannot be. */
  needs(one: Configuration, p: number): boolean {
    this.commit.fill(0)
    return this.#collect(one, p, undefined)
  }

  /** `eligible`: what can be hidden directly before `p`, beside what is free. */
  #collect(one: Configuration, p: number, eligible: Int32Array | undefined): boolean {
    const { commit } = this
    const before = this.#flight.before(p)
    if (!before) return true
    for (let word = 0; word < this.#words; word++) {
      let bits = before[word] & one.bits[word] & ~commit[word]
      const may = this.free(one, word) | (eligible ? eligible[word] : 0)
      if ((bits & ~may) !== 0) return false
      for (; bits !== 0; bits &= bits - 1) {
        const slot = word * 32 + bitIndex(bits)
        commit[word] |= 1 << (slot & 31)
        if (!this.#collect(one, this.#flight.at[slot], eligible)) return false
      }
    }
    return true
  }

  /** Open writes that may be thought of as hidden, a word of them. */
  free(one: Configuration, word: number): number {
    return one.bits[word] & ~one.bits[this.#words + word] & this.#flight.hideable[word]
  }

  /** What is in `commit` is placed. */
  take(one: Configuration): void {
    const slots = this.commit
    for (let b = 0; b < this.#words; b++) {
      one.bits[b] &= ~slots[b]
      one.bits[this.#words + b] &= ~slots[b]
    }
  }
}
