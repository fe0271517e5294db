import type { Values } from '../history/columns.js'

/** A table of values with one more whole number in it. */
export class WithExtraValue implements Values {
  readonly extraId: number
  readonly #values: Values
  readonly #text: string

  /** `text` is the canonical text of a whole number. */
  constructor(values: Values, text: string) {
    this.#values = values
    this.#text = text
    const known = values.find(text)
    this.extraId = known >= 0 ? known : values.size
  }

  get size(): number {
    return Math.max(this.#values.size, this.extraId + 1)
  }

  text(id: number): string {
    return id === this.extraId ? this.#text : this.#values.text(id)
  }

  integer(id: number): bigint | undefined {
    return id === this.extraId ? BigInt(this.#text) : this.#values.integer(id)
  }

  find(text: string): number {
    return text === this.#text ? this.extraId : this.#values.find(text)
  }
}
