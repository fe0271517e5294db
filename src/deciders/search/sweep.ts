/**
 * Whether the operations of a key can be put in one sequence that a single copy would produce, by search.
 *
 * In the spirit of Wing and Gong (1993) and Lowe (2017), but breadth first through time and over a normal form: an
 * operation is placed only when something must be; a read is answered as soon as the copy holds what it returned; an
 * acked write that nobody needs to see is not placed at all but counts as hidden directly before a blind write that
 * came after it in time; an unsure write is placed only where something needs to see it. What is left are
 * configurations of the operations in flight, of which only the undominated ones are kept.
 */
import { CAS, type Values } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import { isRead, isWrite, readValue } from '../../order/roles.js'
import { type Agenda, makeAgenda } from './agenda.js'
import type { Purse } from './budget.js'
import { bitIndex, type Configuration, Configurations, copyInto, isLate, isOpen } from './configurations.js'
import { Flight } from './flight.js'
import { IMPOSSIBLE, type Machine, machineFor } from './machine.js'
import { NO_NODE, Paths } from './paths.js'
import { Placing } from './placing.js'

/** How a search deals with unsure writes that nobody tells apart. */
export interface Manner {
  /** values of which each unsure write is accounted for in a configuration */
  readonly counted: ReadonlySet<number>
  /** step of the agenda from which on they are accounted for; before, there is no end of them */
  readonly countedFrom: number
  /**
   * Of the other values: undefined, there is no end of them once one has begun; else none is used twice on a path, and
   * only so many configurations are kept, the thriftiest ones: `none` is then no answer.
   */
  readonly breadth?: number
}

export type SweepOutcome =
  | {
      readonly found: 'order'
      /** local indices of the writes that show and the reads, in sequence order; hidden writes are not in it */
      readonly sequence: readonly number[]
    }
  | {
      readonly found: 'none'
      /** the operation that could be placed nowhere: those that begin after it ended play no part */
      readonly stuckAt: number
      /** step of the agenda at which that was */
      readonly step: number
    }
  /** an order that uses some unsure writes more than once: these values have to be counted */
  | { readonly found: 'overuse'; readonly values: ReadonlySet<number> }
  | { readonly found: 'spent'; readonly step: number; readonly steps: number; readonly kept: number }

/**
 * Runs the search. Yields now and then, so that others may work; stops when the purse is empty.
 */
export function* sweep(
  counting: Counting,
  values: Values,
  manner: Manner,
  purse: Purse,
): Generator<void, SweepOutcome> {
  return yield* new Sweep(counting, values, manner, purse).run()
}

class Sweep {
  readonly #counting: Counting
  readonly #agenda: Agenda
  readonly #machine: Machine
  readonly #flight: Flight
  readonly #purse: Purse
  readonly #breadth: number | undefined
  readonly #countedFrom: number
  readonly #paths = new Paths()
  readonly #words: number
  /** whether it does not matter which write of a value it was */
  readonly #isByValue: boolean
  readonly #isCounted: (p: number) => boolean
  readonly #hasCas: boolean
  #layer: Configurations
  #spare: Configurations
  readonly #waiting: Configurations
  readonly #scratch: Configuration[] = []
  /** where `#hide` keeps its copy */
  readonly #aside: Configuration
  readonly #placing: Placing
  readonly #wanted = new Set<number>()
  /** the operation that must be placed now, or -1 */
  #due = -1
  /** whether the configuration being worked on had the due write hidden already */
  #wasHidden = false
  /** index of the step of the agenda */
  #step = 0
  /** whether to do without unsure writes */
  #isSparing = false
  /** whether the last placement answered a read */
  #answered = false

  constructor(counting: Counting, values: Values, manner: Manner, purse: Purse) {
    const { counted, breadth } = manner
    const { key } = counting
    this.#counting = counting
    this.#purse = purse
    this.#breadth = breadth
    this.#countedFrom = manner.countedFrom
    this.#agenda = makeAgenda(counting)
    this.#machine = machineFor(counting, values)
    // Where it matters which write of a value it was, no two of them are alike.
    const { readWrite, writeRead } = counting.rule
    this.#isByValue = readWrite === 'all' && writeRead === 'all' && !key.hasIncrements
    this.#isCounted = (p) => !this.#isByValue || !this.#machine.isBlind(p) || counted.has(key.value[p])
    this.#flight = new Flight(counting, this.#agenda, this.#isCounted)
    this.#words = this.#flight.words
    this.#layer = new Configurations(this.#words, breadth !== undefined)
    this.#spare = new Configurations(this.#words, breadth !== undefined)
    this.#waiting = new Configurations(this.#words, breadth !== undefined)
    this.#placing = new Placing(this.#flight, this.#machine)
    this.#hasCas = key.kind.includes(CAS)
    this.#aside = this.#makeConfiguration()
  }

  *run(): Generator<void, SweepOutcome> {
    const { steps } = this.#agenda
    for (const state of this.#machine.initial) {
      this.#layer.insert({ ...this.#makeConfiguration(), state }, this.#flight.reads)
    }
    for (let at = 0; at < steps.length; at++) {
      const step = steps[at]
      this.#step = at
      if (step >= 0) {
        this.#enter(step)
      } else {
        const p = -1 - step
        if (!(yield* this.#force(p)))
          return {
            found: 'spent',
            step: at,
            steps: steps.length,
            kept: this.#layer.size + this.#waiting.size,
          }
        if (this.#layer.size === 0) return { found: 'none', stuckAt: p, step: at }
        this.#flight.leave(p)
      }
      if (this.#paths.isFull) this.#tidy()
    }
    return this.#outcome()
  }

  /** What one of those that are left at the end came about by. */
  #outcome(): SweepOutcome {
    let last = 0
    while (!this.#layer.isLive(last)) last++
    const sequence = this.#paths.sequence(this.#layer.nodeOf(last))
    const seen = new Set<number>()
    const values = new Set<number>()
    for (const p of sequence) {
      if (!isWrite(this.#counting.key, p)) continue
      if (seen.has(p)) values.add(this.#counting.key.value[p])
      seen.add(p)
    }
    return values.size === 0 ? { found: 'order', sequence } : { found: 'overuse', values }
  }

  /** From now on `p` may be placed. */
  #enter(p: number): void {
    const { key } = this.#counting
    const slot = this.#flight.enter(p)
    if (slot < 0) return
    const layer = this.#layer
    if (isWrite(key, p)) {
      for (let i = 0; i < layer.count; i++) {
        if (!layer.isLive(i)) continue
        layer.setOpen(i, slot)
        if (key.acked[p] === 1) layer.setLate(i, slot)
      }
      return
    }
    const next = this.#spare
    next.clear()
    this.#due = -1
    for (let i = 0; i < layer.count; i++) {
      if (!layer.isLive(i)) continue
      const one = this.#at(0)
      layer.load(i, one)
      one.bits[slot >> 5] |= 1 << (slot & 31)
      this.#settle(0, next)
    }
    this.#swap(next)
  }

  #swap(next: Configurations): void {
    this.#spare = this.#layer
    this.#layer = next
  }

  /** Places `p` in every configuration where it is not; those where it cannot be are dropped. False: spent. */
  *#force(p: number): Generator<void, boolean> {
    const layer = this.#layer
    const slot = this.#flight.slotOf[p]
    let open = 0
    for (let i = 0; i < layer.count; i++) if (layer.isLive(i) && layer.isOpen(i, slot)) open++
    if (open === 0) return true
    const next = this.#spare
    const waiting = this.#waiting
    next.clear()
    waiting.clear()
    this.#due = p
    const one = this.#at(0)
    for (let i = 0; i < layer.count; i++) {
      if (!layer.isLive(i)) continue
      layer.load(i, one)
      if (!layer.isOpen(i, slot)) next.append(one)
      else if (this.#agenda.expires[p] === 0) {
        this.#wasHidden = false
        this.#file(one, next)
      }
    }
    // Where an order is enough, unsure writes are for where nothing else helps.
    this.#isSparing = this.#breadth !== undefined
    for (let i = 0; i < waiting.count; i++) {
      if (waiting.isLive(i)) this.#expand(i, next)
      if (i === waiting.count - 1 && this.#isSparing && next.size === 0) {
        this.#isSparing = false
        i = -1
      }
      if (this.#breadth !== undefined && next.size >= 2 * this.#breadth) break
      if (!this.#purse.isTimeToLook()) continue
      if (this.#purse.isSpent()) return false
      yield
    }
    waiting.clear()
    if (this.#breadth !== undefined) next.thin(this.#breadth)
    this.#swap(next)
    return true
  }

  /** Puts a settled configuration where it belongs: done, or to be worked on until the due operation is placed. */
  #file(one: Configuration, next: Configurations): void {
    const { reads } = this.#flight
    const due = this.#due
    if (due < 0) {
      next.insert(one, reads)
      return
    }
    const slot = this.#flight.slotOf[due]
    const [word, bit] = [slot >> 5, 1 << (slot & 31)]
    if ((one.bits[word] & bit) === 0) {
      next.insert(one, reads)
      return
    }
    const isHidden = (this.#placing.free(one, word) & bit) !== 0
    if (isHidden && !this.#wasHidden) this.#hide(one, due, next)
    this.#waiting.insert(one, reads)
  }

  /** A copy of the configuration in which a free write is hidden for good. */
  #hide(one: Configuration, p: number, next: Configurations): void {
    this.#placing.needs(one, p)
    const copy = this.#aside
    copyInto(one, copy)
    const slot = this.#flight.slotOf[p]
    this.#placing.commit[slot >> 5] |= 1 << (slot & 31)
    this.#placing.take(copy)
    next.insert(copy, this.#flight.reads)
  }

  /** Tries every placement that may help in one of the waiting configurations. */
  #expand(i: number, next: Configurations): void {
    const { key } = this.#counting
    const { slotOf, writes, unsure } = this.#flight
    const own = this.#at(0)
    this.#waiting.load(i, own)
    const dueSlot = slotOf[this.#due]
    this.#wasHidden = (this.#placing.free(own, dueSlot >> 5) & (1 << (dueSlot & 31))) !== 0
    const wantsAll = this.#findWanted(own)
    for (const w of writes) {
      if (!isOpen(own, slotOf[w])) continue
      if (w !== this.#due) {
        if (!wantsAll && this.#machine.isBlind(w) && !this.#wanted.has(key.value[w])) continue
        if (this.#hasEqualBefore(own, w)) continue
      }
      this.#try(own, w, next)
    }
    if (this.#isSparing) return
    for (const u of unsure) {
      if (!this.#isCounted(u)) {
        if (wantsAll || this.#wanted.has(key.value[u])) this.#tryUncounted(own, u, next)
        continue
      }
      if (!isOpen(own, slotOf[u])) continue
      if (!wantsAll && this.#machine.isBlind(u) && !this.#wanted.has(key.value[u])) continue
      if (this.#hasEqualUnsureBefore(own, u)) continue
      this.#try(own, u, next)
    }
  }

  /** The values that open reads want to see. True: anything may help. */
  #findWanted(own: Configuration): boolean {
    const { key } = this.#counting
    if (key.hasIncrements || this.#hasCas) return true
    this.#wanted.clear()
    const { reads, at } = this.#flight
    for (let word = 0; word < this.#words; word++) {
      for (let bits = own.bits[word] & reads[word]; bits !== 0; bits &= bits - 1) {
        this.#wanted.add(readValue(key, at[word * 32 + bitIndex(bits)]))
      }
    }
    return false
  }

  /** Whether another open write that does the same must be over earlier: then it goes first, without loss. */
  #hasEqualBefore(own: Configuration, w: number): boolean {
    const { slotOf, writes, related } = this.#flight
    if (related[w] === 1) return false
    const { by } = this.#agenda
    const isOwnLate = isLate(own, this.#words, slotOf[w])
    for (const other of writes) {
      if (other === w || related[other] === 1 || !isOpen(own, slotOf[other])) continue
      if (by[other] > by[w] || (by[other] === by[w] && other > w) || !this.#isEqual(own, other, w)) continue
      if (!isOwnLate || isLate(own, this.#words, slotOf[other])) return true
    }
    return false
  }

  #hasEqualUnsureBefore(own: Configuration, u: number): boolean {
    const { slotOf, unsure, related } = this.#flight
    if (related[u] === 1) return false
    for (const other of unsure) {
      if (other === u) return false
      if (
        related[other] === 0 &&
        slotOf[other] >= 0 &&
        isOpen(own, slotOf[other]) &&
        this.#isEqual(own, other, u)
      )
        return true
    }
    return false
  }

  /** Whether two writes take effect alike and nobody says what either found or left. */
  #isEqual(own: Configuration, a: number, b: number): boolean {
    const { key } = this.#counting
    if (isRead(key, a) || isRead(key, b) || this.#machine.isBlind(a) !== this.#machine.isBlind(b))
      return false
    if (!this.#machine.isBlind(a) && (key.kind[a] !== key.kind[b] || key.extra[a] !== key.extra[b]))
      return false
    return this.#machine.after(own.state, a) === this.#machine.after(own.state, b)
  }

  /** Places an unsure write that is not among the slots: the first of its value left over, or one too many. */
  #tryUncounted(own: Configuration, u: number, next: Configurations): void {
    const { key } = this.#counting
    const { unsure } = this.#flight
    // The first of each value stands for all of them.
    for (const other of unsure) {
      if (other === u) break
      if (key.value[other] === key.value[u] && !this.#isCounted(other)) return
    }
    const alike = unsure.filter((other) => key.value[other] === key.value[u] && !this.#isCounted(other))
    for (const other of alike) if (!own.used.includes(other) && this.#try(own, other, next)) return
    if (this.#breadth !== undefined) return
    for (const other of alike) if (own.used.includes(other) && this.#try(own, other, next)) return
  }

  /** Places a write in a copy of the configuration and files what comes of it. False: it cannot go there. */
  #try(own: Configuration, w: number, next: Configurations): boolean {
    this.#purse.spent++
    const one = this.#at(1)
    copyInto(own, one)
    const isUnsure = this.#counting.key.acked[w] === 0
    const isEndless =
      isUnsure && this.#step < this.#countedFrom && this.#isByValue && this.#machine.isBlind(w)
    if (!this.#placing.place(one, w, isEndless)) return false
    if (isUnsure && (this.#breadth !== undefined || this.#flight.slotOf[w] < 0) && !one.used.includes(w))
      one.used = [...one.used, w]
    one.node = this.#paths.add(one.node, w)
    this.#answered = false
    // A blind write that nobody sees might as well be hidden before the next one.
    const isSeen = w === this.#due || !this.#machine.isBlind(w) || this.#counting.key.hasIncrements
    this.#settle(1, next, isSeen)
    return true
  }

  /**
   * Answers every open read that fits, and files the outcome. Where an answer costs something (a write can no longer
   * show, an unknown start is known) there are two outcomes. `evenIfUnseen`: file it also where nobody saw the
   * placement.
   */
  #settle(depth: number, next: Configurations, evenIfUnseen = true): void {
    const one = this.#at(depth)
    const { reads, at } = this.#flight
    const costly: number[] = []
    for (let again = true; again; ) {
      again = false
      costly.length = 0
      for (let word = 0; word < this.#words; word++) {
        for (let bits = one.bits[word] & reads[word]; bits !== 0; bits &= bits - 1) {
          const r = at[word * 32 + bitIndex(bits)]
          const state = this.#machine.read(one.state, r)
          if (state === IMPOSSIBLE) continue
          if (!this.#placing.needs(one, r)) continue
          if (state !== one.state || this.#placing.commit.some((b) => b !== 0)) {
            costly.push(r)
            continue
          }
          this.#answer(one, r)
          again = this.#flight.relations > 0
        }
      }
    }
    for (const r of costly) {
      const copy = this.#at(depth + 1)
      copyInto(one, copy)
      this.#placing.needs(copy, r)
      this.#placing.take(copy)
      copy.state = this.#machine.read(one.state, r)
      const answered = this.#answered
      this.#answer(copy, r)
      this.#settle(depth + 1, next)
      this.#answered = answered
    }
    if (evenIfUnseen || this.#answered || this.#isFoundByCas(one)) this.#file(one, next)
  }

  #answer(one: Configuration, r: number): void {
    const slot = this.#flight.slotOf[r]
    one.bits[slot >> 5] &= ~(1 << (slot & 31))
    one.node = this.#paths.add(one.node, r)
    this.#answered = true
  }

  /** Whether an open cas would find what is there. */
  #isFoundByCas(one: Configuration): boolean {
    if (!this.#hasCas) return false
    const { key } = this.#counting
    const { slotOf, writes, unsure } = this.#flight
    const finds = (p: number): boolean =>
      key.kind[p] === CAS && isOpen(one, slotOf[p]) && this.#machine.after(one.state, p) !== IMPOSSIBLE
    return writes.some(finds) || unsure.some(finds)
  }

  #at(depth: number): Configuration {
    let one = this.#scratch[depth]
    if (!one) this.#scratch[depth] = one = this.#makeConfiguration()
    return one
  }

  #makeConfiguration(): Configuration {
    return { state: 0, bits: new Int32Array(2 * this.#words), node: NO_NODE, used: [] }
  }

  /** Forgets the paths of configurations that are gone. */
  #tidy(): void {
    const layer = this.#layer
    const live: number[] = []
    for (let i = 0; i < layer.count; i++) if (layer.isLive(i)) live.push(i)
    const nodes = this.#paths.tidy(live.map((i) => layer.nodeOf(i)))
    for (let k = 0; k < live.length; k++) layer.setNode(live[k], nodes[k])
  }
}
