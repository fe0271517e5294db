/**
 * What a search may cost. The search knows no clock: whoever starts it says when it has gone on long enough.
 */
export interface Budget {
  /** most placements to try, over all searches on this budget together */
  readonly steps: number
  /** asked now and then: whether to stop */
  isSpent?(): boolean
}

/** Some ten seconds at worst. */
export const DEFAULT_BUDGET: Budget = { steps: 5_000_000 }

/** For the many small questions that a counterexample or a margin takes: an answer in a moment, or none. */
export const SMALL_BUDGET: Budget = { steps: 100_000 }

/** Counts what a search has cost. */
export class Purse {
  /** placements tried */
  spent = 0
  readonly #budget: Budget
  #nextLook: number

  constructor(budget: Budget) {
    this.#budget = budget
    this.#nextLook = Math.min(LOOK, budget.steps)
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
