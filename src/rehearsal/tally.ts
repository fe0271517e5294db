/**
 * Decides, as a counter is used, which counts are impossible under true time: fewer than the increments that were
 * acknowledged before, or than a count read before; more than all that had begun.
 */
import type { Cell, Operation } from './operation.js'

export class Tally {
  /** sum of the increments acknowledged, and of those begun */
  #acked = 0
  #begun = 0
  /** greatest count that an ended operation returned */
  #seen = 0
  /** by open operation: the least that it may see */
  readonly #leasts = new Map<Operation, number>()

  /** whether increments answer the count after them */
  readonly returnsCount: boolean

  constructor(returnsCount: boolean) {
    this.returnsCount = returnsCount
  }

  begun(operation: Operation): void {
    if (operation.kind === 'increment') this.#begun += operation.by
    this.#leasts.set(operation, Math.max(this.#acked, this.#seen))
  }

  gaveUp(operation: Operation): void {
    this.#leasts.delete(operation)
  }

  ended(operation: Operation, { count }: Cell): boolean | 'over' {
    const least = this.#leasts.get(operation)!
    this.#leasts.delete(operation)
    const isIncrement = operation.kind === 'increment'
    if (isIncrement) this.#acked += operation.by
    if (isIncrement && !this.returnsCount) return false
    this.#seen = Math.max(this.#seen, count)
    if (count > this.#begun) return 'over'
    return count < least + (isIncrement ? operation.by : 0)
  }
}
