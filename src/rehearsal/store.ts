/**
 * What a client sees of any store.
 */
import type { Answer, Operation } from './operation.js'

export interface Store {
  /** Sends a request; the answer may come late, twice (where it was sent twice), or never. */
  send(operation: Operation, reply: (answer: Answer) => void): void
  /** The client waits no longer, and looks for the leader anew. */
  gaveUp(operation: Operation): void
}
