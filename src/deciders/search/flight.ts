/**
 * The operations that the search has to think of at one moment, each with a slot, and which of them must come before
 * which. On one clock hardly any two operations in flight are so related; across hosts, and under promises that leave
 * reads free, many are.
 */
import { INCREMENT } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import { isRead, isWrite } from '../../order/roles.js'
import { type Agenda, mustPrecede } from './agenda.js'

export class Flight {
  /** words of a bit set over the slots */
  readonly words: number
  /** local index → slot, or -1 */
  readonly slotOf: Int32Array
  /** slot → local index, or -1 */
  readonly at: Int32Array
  /** slots of operations that only read */
  readonly reads: Int32Array
  /** slots of acked writes that may be hidden before a blind write: nobody says what they found or left */
  readonly hideable: Int32Array
  /** acked writes in flight, in local order */
  readonly writes: number[] = []
  /** unsure writes that may take effect, in local order */
  readonly unsure: number[] = []
  /** local index → 1 where some other operation in flight must come before it, or it before one, at any time */
  readonly related: Uint8Array
  /** whether any two in flight are related now */
  relations = 0
  readonly #counting: Counting
  readonly #counted: (p: number) => boolean
  /** local index → slots of what must come before it */
  readonly #before = new Map<number, Int32Array>()
  readonly #free: number[] = []
  readonly #live = new Set<number>()

  /** `counted`: whether an unsure write has a slot of its own. */
  constructor(counting: Counting, agenda: Agenda, counted: (p: number) => boolean) {
    const { key } = counting
    this.#counting = counting
    this.#counted = counted
    let now = 0
    let most = 0
    for (const step of agenda.steps) {
      if (step < 0) now--
      else if (key.acked[step] === 1 || counted(step)) now++
      if (now > most) most = now
    }
    this.words = Math.max(1, (most + 31) >> 5)
    this.slotOf = new Int32Array(key.n).fill(-1)
    this.at = new Int32Array(this.words * 32).fill(-1)
    this.reads = new Int32Array(this.words)
    this.hideable = new Int32Array(this.words)
    this.related = new Uint8Array(key.n)
    for (let slot = this.words * 32 - 1; slot >= 0; slot--) this.#free.push(slot)
    this.#findRelated(agenda)
  }

  /** Slots of what must come before an operation in flight; undefined: nothing. */
  before(p: number): Int32Array | undefined {
    return this.#before.get(p)
  }

  /** Takes an operation in. Returns its slot, -1 for an unsure write without one. */
  enter(p: number): number {
    const { key } = this.#counting
    let slot = -1
    if (key.acked[p] === 1 || this.#counted(p)) {
      slot = this.#free.pop()!
      this.slotOf[p] = slot
      this.at[slot] = p
      const bit = 1 << (slot & 31)
      if (!isWrite(key, p)) this.reads[slot >> 5] |= bit
      else if (key.acked[p] === 1 && !isRead(key, p) && (key.kind[p] !== INCREMENT || key.hasWrites))
        this.hideable[slot >> 5] |= bit
    }
    if (key.acked[p] === 0) this.unsure.push(p)
    else if (isWrite(key, p)) insertSorted(this.writes, p)
    for (const a of this.#live) {
      if (mustPrecede(this.#counting, a, p)) this.#relate(a, p)
      if (mustPrecede(this.#counting, p, a)) this.#relate(p, a)
    }
    this.#live.add(p)
    return slot
  }

  /** Lets an acked operation go: it has been placed everywhere. */
  leave(p: number): void {
    const slot = this.slotOf[p]
    const [word, bit] = [slot >> 5, 1 << (slot & 31)]
    for (const [q, before] of this.#before) {
      before[word] &= ~bit
      if (before.every((bits) => bits === 0)) this.#before.delete(q)
    }
    this.#before.delete(p)
    this.relations = this.#before.size
    this.reads[word] &= ~bit
    this.hideable[word] &= ~bit
    this.at[slot] = -1
    this.slotOf[p] = -1
    this.#free.push(slot)
    this.#live.delete(p)
    const place = this.writes.indexOf(p)
    if (place >= 0) this.writes.splice(place, 1)
  }

  #relate(a: number, b: number): void {
    const before = this.#before.get(b) ?? new Int32Array(this.words)
    this.#before.set(b, before)
    const slot = this.slotOf[a]
    before[slot >> 5] |= 1 << (slot & 31)
    this.relations = this.#before.size
  }

  /** Marks whatever is related to another operation while both are in flight. */
  #findRelated({ steps }: Agenda): void {
    const live = new Set<number>()
    for (const step of steps) {
      if (step < 0) {
        live.delete(-1 - step)
        continue
      }
      for (const a of live) {
        if (!mustPrecede(this.#counting, a, step) && !mustPrecede(this.#counting, step, a)) continue
        this.related[a] = 1
        this.related[step] = 1
      }
      live.add(step)
    }
  }
}

function insertSorted(list: number[], p: number): void {
  let at = list.length
  while (at > 0 && list[at - 1] > p) at--
  list.splice(at, 0, p)
}
