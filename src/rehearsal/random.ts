/**
 * Chance, seeded, and the same on every machine: whole numbers and comparisons only, no library logarithm whose last
 * digit one machine rounds otherwise than another.
 */

import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus'
import type { JumpableRandomGenerator } from 'pure-rand/types/JumpableRandomGenerator'

const TWO_32 = 4294967296

/** Streams of chance that do not touch one another: what one of them is asked for does not change the others. */
export function randomStreams(seed: number, count: number): Random[] {
  const generator = xoroshiro128plus(seed | 0)
  return Array.from({ length: count }, () => {
    const stream = new Random(generator.clone())
    generator.jump()
    return stream
  })
}

export class Random {
  readonly #generator: Pick<JumpableRandomGenerator, 'next'>

  constructor(generator: Pick<JumpableRandomGenerator, 'next'>) {
    this.#generator = generator
  }

  /** A whole number from 0 to 2^32 − 1. */
  #bits(): number {
    return this.#generator.next() >>> 0
  }

  /** A whole number from 0 to n − 1, n up to 2^21. */
  below(n: number): number {
    return Math.floor((this.#bits() * n) / TWO_32)
  }

  /** A whole number from −reach to reach, reach up to 2^50. */
  around(reach: number): number {
    return Math.round((this.#bits() / TWO_32) * 2 * reach) - reach
  }

  /** True with this probability. */
  chance(probability: number): boolean {
    return this.#bits() < probability * TWO_32
  }

  pick<T>(items: readonly T[]): T {
    return items[this.below(items.length)]
  }

  /** Some of the numbers 0 to n − 1, each set of them as likely as any other. */
  choose(count: number, n: number): number[] {
    const all = Array.from({ length: n }, (_, i) => i)
    for (let i = 0; i < count; i++) {
      const j = i + this.below(n - i)
      const kept = all[i]
      all[i] = all[j]
      all[j] = kept
    }
    return all.slice(0, count)
  }

  /**
   * Exponentially distributed, rounded down to a whole number. By von Neumann's method (Various techniques used in
   * connection with random digits, 1951): the length of a falling run of uniform numbers decides, nothing is computed.
   */
  exponential(mean: number): number {
    for (let whole = 0; ; whole++) {
      const first = this.#bits()
      let last = first
      let isKept = true
      for (let next = this.#bits(); next < last; next = this.#bits()) {
        last = next
        isKept = !isKept
      }
      if (isKept) return Math.floor((whole + first / TWO_32) * mean)
    }
  }
}
