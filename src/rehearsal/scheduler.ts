/**
 * Simulated time: what is to happen, and when. Times are whole nanoseconds since the start of the rehearsal.
 */
import FlatQueue from 'flatqueue'

/** Nanoseconds in a millisecond. */
export const MS = 1_000_000

export class Scheduler {
  readonly #queue = new FlatQueue<() => void>()
  #now = 0

  get now(): number {
    return this.#now
  }

  /** Has something happen so many nanoseconds from now. */
  after(delay: number, action: () => void): void {
    this.#queue.push(action, this.#now + Math.max(0, delay))
  }

  /** Has something happen at a time; at once, where that is past. */
  at(time: number, action: () => void): void {
    this.after(time - this.#now, action)
  }

  /** Lets the next thing happen. False: nothing is left. */
  step(): boolean {
    const time = this.#queue.peekValue()
    if (time === undefined) return false
    this.#now = time
    this.#queue.pop()!()
    return true
  }
}
