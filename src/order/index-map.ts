/**
 * A map from small whole numbers to small whole numbers: a flat array where it will be well filled, a Map where
 * the numbers are few among many.
 */
export class IndexMap {
  readonly #flat: Int32Array | undefined
  readonly #sparse: Map<number, number> | undefined

  /** Keys lie in 0 … range - 1; about `expected` of them will be set. Values are not negative. */
  constructor(range: number, expected: number) {
    if (expected * 8 >= range) this.#flat = new Int32Array(range).fill(-1)
    else this.#sparse = new Map()
  }

  /** The value, or -1. */
  get(key: number): number {
    return this.#flat ? this.#flat[key] : (this.#sparse!.get(key) ?? -1)
  }

  set(key: number, value: number): void {
    if (this.#flat) this.#flat[key] = value
    else this.#sparse!.set(key, value)
  }
}
