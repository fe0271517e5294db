/**
 * Distinct byte strings with dense ids, in order of first appearance: an open-addressing table over one arena.
 */
import type { Names } from './columns.js'
import { decodeUtf8 } from './utf8.js'

export class ByteTable implements Names {
  #arena = new Uint8Array(1 << 12)
  #used = 0
  /** id → where its bytes begin; one more entry marks the end of the last */
  #offset = new Uint32Array(1 << 8)
  #hash = new Uint32Array(1 << 8)
  /** slot → id + 1, 0 where empty; kept under half full */
  #slots = new Int32Array(1 << 9)
  #size = 0
  /** seeded, so that no input can be made to collide on purpose */
  readonly #seed = (Math.random() * 0xffffffff) >>> 0

  get size(): number {
    return this.#size
  }

  /** The id of these bytes, a new one when they are new. */
  intern(bytes: Uint8Array, from: number, to: number): number {
    let hash = this.#seed ^ (to - from)
    let at = from
    for (const whole = to - 3; at < whole; at += 4) {
      const word = bytes[at] | (bytes[at + 1] << 8) | (bytes[at + 2] << 16) | (bytes[at + 3] << 24)
      hash = Math.imul(hash ^ word, 0x9e3779b1)
      hash ^= hash >>> 15
    }
    for (; at < to; at++) hash = Math.imul(hash ^ bytes[at], 0x01000193)
    hash = Math.imul(hash ^ (hash >>> 16), 0x85ebca6b)
    hash = (hash ^ (hash >>> 13)) >>> 0
    const slots = this.#slots
    const mask = slots.length - 1
    let slot = hash & mask
    for (let entry = slots[slot]; entry !== 0; entry = slots[slot]) {
      if (this.#hash[entry - 1] === hash && this.#isEqual(entry - 1, bytes, from, to)) return entry - 1
      slot = (slot + 1) & mask
    }
    return this.#add(bytes, from, to, hash, slot)
  }

  name(id: number): string {
    return decodeUtf8(this.#arena, this.#offset[id], this.#offset[id + 1])
  }

  find(name: string): number {
    for (let id = 0; id < this.#size; id++) if (this.name(id) === name) return id
    return -1
  }

  #isEqual(id: number, bytes: Uint8Array, from: number, to: number): boolean {
    let at = this.#offset[id]
    if (this.#offset[id + 1] - at !== to - from) return false
    const arena = this.#arena
    for (let i = from; i < to; i++) if (arena[at++] !== bytes[i]) return false
    return true
  }

  #add(bytes: Uint8Array, from: number, to: number, hash: number, slot: number): number {
    const id = this.#size++
    const length = to - from
    if (this.#used + length > this.#arena.length) {
      const larger = new Uint8Array(Math.max(this.#arena.length * 2, this.#used + length))
      larger.set(this.#arena)
      this.#arena = larger
    }
    if (id + 1 >= this.#offset.length) {
      this.#offset = grown(this.#offset)
      this.#hash = grown(this.#hash)
    }
    this.#arena.set(bytes.subarray(from, to), this.#used)
    this.#used += length
    this.#offset[id + 1] = this.#used
    this.#hash[id] = hash
    this.#slots[slot] = id + 1
    if (this.#size * 2 > this.#slots.length) this.#rehash()
    return id
  }

  #rehash(): void {
    const slots = new Int32Array(this.#slots.length * 2)
    const mask = slots.length - 1
    for (let id = 0; id < this.#size; id++) {
      let slot = this.#hash[id] & mask
      while (slots[slot] !== 0) slot = (slot + 1) & mask
      slots[slot] = id + 1
    }
    this.#slots = slots
  }
}

function grown(old: Uint32Array): Uint32Array<ArrayBuffer> {
  const larger = new Uint32Array(old.length * 2)
  larger.set(old)
  return larger
}
