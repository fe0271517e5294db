/**
 * A segment tree over positions: add to a prefix, greatest of a range. Numbers, -Infinity where nothing stands.
 */
export class RangeTree {
  readonly #size: number
  readonly #greatest: Float64Array
  readonly #pending: Float64Array

  constructor(values: Float64Array) {
    let size = 1
    while (size < values.length) size *= 2
    this.#size = size
    this.#greatest = new Float64Array(2 * size).fill(Number.NEGATIVE_INFINITY)
    this.#pending = new Float64Array(2 * size)
    this.#greatest.set(values, size)
    for (let i = size - 1; i > 0; i--)
      this.#greatest[i] = Math.max(this.#greatest[2 * i], this.#greatest[2 * i + 1])
  }

  /** Adds `amount` to the positions before `end`. O(log n). */
  addBefore(end: number, amount: number): void {
    this.#add(1, 0, this.#size, end, amount)
  }

  #add(node: number, low: number, high: number, end: number, amount: number): void {
    if (end <= low) return
    if (high <= end) {
      this.#greatest[node] += amount
      this.#pending[node] += amount
      return
    }
    const middle = (low + high) / 2
    this.#add(2 * node, low, middle, end, amount)
    this.#add(2 * node + 1, middle, high, end, amount)
    this.#greatest[node] =
      Math.max(this.#greatest[2 * node], this.#greatest[2 * node + 1]) + this.#pending[node]
  }

  /** The greatest value at positions from … to-1, -Infinity when there is none. O(log n). */
  greatest(from: number, to: number): number {
    return from < to ? this.#find(1, 0, this.#size, from, to) : Number.NEGATIVE_INFINITY
  }

  #find(node: number, low: number, high: number, from: number, to: number): number {
    if (to <= low || high <= from) return Number.NEGATIVE_INFINITY
    if (from <= low && high <= to) return this.#greatest[node]
    const middle = (low + high) / 2
    const left = this.#find(2 * node, low, middle, from, to)
    const right = this.#find(2 * node + 1, middle, high, from, to)
    return Math.max(left, right) + this.#pending[node]
  }
}
