/**
 * A set of configurations of the search, the undominated ones, in flat arrays.
 *
 * A configuration is a state of the copy and two bit sets over the slots of the operations in flight: `open`, what is
 * not placed yet (reads: not answered), and `late`, writes among them that cannot be thought of as hidden before the
 * last blind write any more. At equal state one that has fewer reads open, fewer writes placed and fewer of them late
 * is at least as good: whatever the other one can still do, it can.
 */
export interface Configuration {
  state: number
  /** `words` words of open, then as many of late */
  readonly bits: Int32Array
  /** its path, a node of `Paths` */
  node: number
  /** unsure writes that its path used, in order of use, where the search goes by them */
  used: readonly number[]
}

export class Configurations {
  /** entries, dead ones included: look at `isLive` */
  count = 0
  /** live entries */
  size = 0
  readonly #words: number
  #state = new Int32Array(64)
  #bits: Int32Array
  #node = new Int32Array(64)
  #next = new Int32Array(64)
  #isDead = new Uint8Array(64)
  #used: (readonly number[])[] = []
  readonly #heads = new Map<number, number>()

  readonly #areCounted: boolean

  /** `words` of a bit set; `areCounted`: whether it is better to have used fewer unsure writes. */
  constructor(words: number, areCounted: boolean) {
    this.#words = words
    this.#areCounted = areCounted
    this.#bits = new Int32Array(64 * 2 * words)
  }

  clear(): void {
    this.count = 0
    this.size = 0
    this.#used.length = 0
    this.#heads.clear()
  }

  isLive(i: number): boolean {
    return this.#isDead[i] === 0
  }

  nodeOf(i: number): number {
    return this.#node[i]
  }

  setNode(i: number, node: number): void {
    this.#node[i] = node
  }

  usedBy(i: number): readonly number[] {
    return this.#used[i]
  }

  stateOf(i: number): number {
    return this.#state[i]
  }

  isOpen(i: number, slot: number): boolean {
    return (this.#bits[i * 2 * this.#words + (slot >> 5)] & (1 << (slot & 31))) !== 0
  }

  setOpen(i: number, slot: number): void {
    this.#bits[i * 2 * this.#words + (slot >> 5)] |= 1 << (slot & 31)
  }

  setLate(i: number, slot: number): void {
    this.#bits[(i * 2 + 1) * this.#words + (slot >> 5)] |= 1 << (slot & 31)
  }

  /** Copies entry i. */
  load(i: number, into: Configuration): void {
    const stride = 2 * this.#words
    const from = i * stride
    for (let b = 0; b < stride; b++) into.bits[b] = this.#bits[from + b]
    into.state = this.#state[i]
    into.node = this.#node[i]
    into.used = this.#used[i]
  }

  /**
   * Adds a copy unless one that is at least as good is there; drops those that it is at least as good as. `reads` is
   * the bit set of slots that reads have. Returns whether it was added.
   */
  insert(one: Configuration, reads: Int32Array): boolean {
    let before = -1
    for (let i = this.#heads.get(one.state) ?? -1; i >= 0; ) {
      const next = this.#next[i]
      const comparison = this.#compare(i, one.bits, reads)
      const isThriftier = this.#areCounted && one.used.length < this.#used[i].length
      if ((comparison & KNOWN_AS_GOOD) !== 0 && !isThriftier) return false
      if (
        (comparison & NEW_AS_GOOD) !== 0 &&
        (!this.#areCounted || one.used.length <= this.#used[i].length)
      ) {
        this.#isDead[i] = 1
        this.size--
        if (before < 0) this.#heads.set(one.state, next)
        else this.#next[before] = next
      } else {
        before = i
      }
      i = next
    }
    this.append(one)
    return true
  }

  /** Adds a copy that is known to be comparable with none of the others. */
  append(one: Configuration): void {
    const i = this.count++
    this.size++
    if (i === this.#state.length) this.#grow()
    const stride = 2 * this.#words
    const to = i * stride
    for (let b = 0; b < stride; b++) this.#bits[to + b] = one.bits[b]
    this.#state[i] = one.state
    this.#node[i] = one.node
    this.#used[i] = one.used
    this.#isDead[i] = 0
    this.#next[i] = this.#heads.get(one.state) ?? -1
    this.#heads.set(one.state, i)
  }

  /** Drops all but the `most` entries that used the fewest unsure writes. */
  thin(most: number): void {
    if (this.size <= most) return
    const live: number[] = []
    for (let i = 0; i < this.count; i++) if (this.isLive(i)) live.push(i)
    live.sort((a, b) => this.#used[a].length - this.#used[b].length || a - b)
    for (const i of live.slice(most)) this.#isDead[i] = 1
    this.size = most
    this.#heads.clear()
    for (const i of live.slice(0, most)) {
      this.#next[i] = this.#heads.get(this.#state[i]) ?? -1
      this.#heads.set(this.#state[i], i)
    }
  }

  /** Which of entry i and a new one of the same state is at least as good as the other, as two flags. */
  #compare(i: number, bits: Int32Array, reads: Int32Array): number {
    const words = this.#words
    const own = i * 2 * words
    let result = KNOWN_AS_GOOD | NEW_AS_GOOD
    for (let b = 0; b < words; b++) {
      const knownOpen = this.#bits[own + b]
      const newOpen = bits[b]
      const knownLate = this.#bits[own + words + b]
      const newLate = bits[words + b]
      const onlyKnown = knownOpen & ~newOpen
      const onlyNew = newOpen & ~knownOpen
      const read = reads[b]
      if (((onlyKnown & read) | (onlyNew & ~read) | (knownLate & ~newLate)) !== 0) result &= ~KNOWN_AS_GOOD
      if (((onlyNew & read) | (onlyKnown & ~read) | (newLate & ~knownLate)) !== 0) result &= ~NEW_AS_GOOD
      if (result === 0) return 0
    }
    return result
  }

  #grow(): void {
    const room = 2 * this.#state.length
    this.#state = grown(this.#state, room)
    this.#bits = grown(this.#bits, room * 2 * this.#words)
    this.#node = grown(this.#node, room)
    this.#next = grown(this.#next, room)
    const isDead = new Uint8Array(room)
    isDead.set(this.#isDead)
    this.#isDead = isDead
  }
}

const KNOWN_AS_GOOD = 1
const NEW_AS_GOOD = 2

export function grown(array: Int32Array, length: number): Int32Array<ArrayBuffer> {
  const larger = new Int32Array(length)
  larger.set(array)
  return larger
}

export function copyInto(from: Configuration, to: Configuration): void {
  to.bits.set(from.bits)
  to.state = from.state
  to.node = from.node
  to.used = from.used
}

/** Whether a slot is open. */
export function isOpen(one: Configuration, slot: number): boolean {
  return (one.bits[slot >> 5] & (1 << (slot & 31))) !== 0
}

/** Whether a slot is among the late ones. */
export function isLate(one: Configuration, words: number, slot: number): boolean {
  return (one.bits[words + (slot >> 5)] & (1 << (slot & 31))) !== 0
}

/** The index of the lowest bit set. */
export function bitIndex(bits: number): number {
  return 31 - Math.clz32(bits & -bits)
}
