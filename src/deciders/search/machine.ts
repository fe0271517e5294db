/**
 * What a single copy of the key holds, and how it answers: the sequential object that the search runs.
 *
 * A state is a small integer. Two configurations in the same state answer every later request alike.
 */
import type { Values } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import { NumberMachine } from './number-machine.js'
import { RegisterMachine } from './register-machine.js'

/** No such state: the copy could not have answered so. */
export const IMPOSSIBLE = -(2 ** 31)

export interface Machine {
  /** states that the key may have started in */
  readonly initial: readonly number[]
  /** The state that local write `p` leaves behind, IMPOSSIBLE where it could not have taken effect there. */
  after(state: number, p: number): number
  /**
   * The state in which local read `p` leaves the copy: the same one, IMPOSSIBLE where the answer does not fit, or one
   * that knows more of an unknown start.
   */
  read(state: number, p: number): number
  /** Whether `p` takes effect whatever was there and leaves nothing of it. */
  isBlind(p: number): boolean
}

/** The machine of a register, mixed or counter key. `starts`: value ids that an unknown start may have been. */
export function machineFor(counting: Counting, values: Values): Machine {
  return counting.key.hasIncrements ? new NumberMachine(counting, values) : new RegisterMachine(counting)
}
