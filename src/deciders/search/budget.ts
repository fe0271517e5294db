/**
 * What a search may cost. The search knows no clock: whoever starts it says when it has gone on long enough.
 */
export interface Budget {
  /** most placements to try, over all searches on this budget together */
  readonly steps: number
  /** asked now and then: whether to stop */
  isSpent?(): boolean
}

/** Enough for every key of a real store that we know of; some tens of seconds at worst. */
export const DEFAULT_BUDGET: Budget = { steps: 30_000_000 }

/** Counts what a search has cost. */
export class Purse {
  /** placements tried */
  spent = 0
  readonly #budget: Budget
  #nextLook = LOOK

  constructor(budget: Budget) {
    this.#budget = budget
  }

  /** True when it is time to let others work, and to look whether to stop. */
  isTimeToLook(): boolean {
    if (this.spent < this.#nextLook) return false
    this.#nextLook = this.spent + LOOK
    return true
  }

  isSpent(): boolean {
    return this.spent >= this.#budget.steps || (this.#budget.isSpent?.() ?? false)
  }
}

/** Placements between two looks: some milliseconds. */
const LOOK = 20_000
