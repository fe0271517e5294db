/**
 * The values that are written to berths.
 */
import { vesselName } from './names.js'
import type { Random } from './random.js'

export class Vessels {
  readonly #random: Random
  readonly #different: number | undefined
  #count = 0

  /** `different`: so many names, drawn by chance; undefined: no name twice. */
  constructor(random: Random, different: number | undefined) {
    this.#random = random
    this.#different = different
  }

  /** A name, as JSON. */
  next(): string {
    const n = this.#different === undefined ? this.#count++ : this.#random.below(this.#different)
    return JSON.stringify(vesselName(n))
  }
}
