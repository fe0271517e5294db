/**
 * Whether an operation precedes any of a set, without looking at each: the latest starts are enough.
 */
import type { Recorded } from './recorded.js'

/** The latest starts of the operations added: of all, on each clock, of each client. */
export class Latest {
  readonly #recorded: Recorded
  #all = -1
  readonly #onHost = new Map<number, number>()
  readonly #ofClient = new Map<number, number>()

  constructor(recorded: Recorded) {
    this.#recorded = recorded
  }

  add(i: number): void {
    const { client, host } = this.#recorded.history
    if (this.#all < 0 || this.#recorded.start(i) > this.#recorded.start(this.#all)) this.#all = i
    const onHost = this.#onHost.get(host[i])
    if (onHost === undefined || this.#recorded.start(i) > this.#recorded.start(onHost))
      this.#onHost.set(host[i], i)
    const ofClient = this.#ofClient.get(client[i])
    if (ofClient === undefined || this.#isLater(i, ofClient)) this.#ofClient.set(client[i], i)
  }

  /** Whether a precedes any of them, `delayNs` and more having gone by; `byTime`: in a session too, by time. */
  isAfter(a: number, delayNs: bigint, byTime = false): boolean {
    const recorded = this.#recorded
    const { client, host } = recorded.history
    const isBefore = (b: number | undefined): boolean =>
      b !== undefined && b >= 0 && recorded.end(a) + delayNs + recorded.slack(a, b) < recorded.start(b)
    // Whoever is certainly later than the clock error allows for is later on any clock.
    if (isBefore(this.#all) || isBefore(this.#onHost.get(host[a]))) return true
    const own = this.#ofClient.get(client[a])
    return byTime ? isBefore(own) : own !== undefined && recorded.inSession(a, own)
  }

  isLaterInSession(a: number): boolean {
    const own = this.#ofClient.get(this.#recorded.history.client[a])
    return own !== undefined && this.#recorded.inSession(a, own)
  }

  #isLater(a: number, b: number): boolean {
    return this.#recorded.inSession(b, a)
  }
}
