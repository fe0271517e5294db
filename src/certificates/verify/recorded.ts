/**
 * The recording as the verifier sees it: each operation by its number (0 is the first of the first file), its times
 * exact, and precedence by the three rules of docs/promises.md. Shares no code with the deciders.
 */
import {
  ACKED,
  CAS,
  DELETE,
  type History,
  INCREMENT,
  NO_VALUE,
  READ,
  REFUSED,
} from '../../history/columns.js'

export class Recorded {
  readonly history: History
  readonly #uncertaintyNs: bigint

  constructor(history: History, clockErrorNs: bigint) {
    this.history = history
    this.#uncertaintyNs = 2n * clockErrorNs
  }

  start(i: number): bigint {
    return this.history.times.startNs(i)
  }

  /** Call it only where the request came back. */
  end(i: number): bigint {
    return this.history.times.endNs(i)
  }

  isAcked(i: number): boolean {
    return this.history.outcome[i] === ACKED
  }

  /** Refused operations and reads without an answer say nothing. */
  counts(i: number): boolean {
    const { outcome, kind } = this.history
    return outcome[i] !== REFUSED && (kind[i] !== READ || this.isAcked(i))
  }

  writes(i: number): boolean {
    const { kind, applied } = this.history
    return kind[i] !== READ && !(kind[i] === CAS && this.isAcked(i) && applied[i] === 0)
  }

  reads(i: number): boolean {
    const { kind, value } = this.history
    return (
      this.isAcked(i) &&
      (kind[i] === READ || kind[i] === CAS || (kind[i] === INCREMENT && value[i] !== NO_VALUE))
    )
  }

  /** The value id that a write leaves; call it for all but increments. */
  written(i: number): number {
    return this.history.kind[i] === DELETE ? 0 : this.history.value[i]
  }

  /** The value id that an operation found, NO_VALUE where it does not say. */
  found(i: number): number {
    const { kind, applied, extra, saw, value } = this.history
    if (kind[i] === READ) return value[i]
    if (kind[i] !== CAS) return NO_VALUE
    return this.isAcked(i) && applied[i] === 0 ? (saw?.[i] ?? NO_VALUE) : extra[i]
  }

  /** Whether one clock stamped both. */
  oneClock(a: number, b: number): boolean {
    return this.history.client[a] === this.history.client[b] || this.history.host[a] === this.history.host[b]
  }

  /** How much later than an end another start must be, in nanoseconds, to be certainly later. */
  slack(a: number, b: number): bigint {
    return this.oneClock(a, b) ? 0n : this.#uncertaintyNs
  }

  /** Whether a time is earlier than another, whatever clocks showed the two. */
  isSurelyEarlier(ns: bigint, than: bigint): boolean {
    return ns + this.#uncertaintyNs < than
  }

  /** Session order: what one client did first. Where the times allow both ways round, the earlier line. */
  inSession(a: number, b: number): boolean {
    const { client, hasEnd } = this.history
    if (a === b || client[a] !== client[b] || hasEnd[a] === 0 || this.end(a) > this.start(b)) return false
    const alsoBackward = hasEnd[b] === 1 && this.end(b) <= this.start(a)
    return !alsoBackward || a < b
  }

  /** a ≺ b: a certainly finished before b began. */
  precedes(a: number, b: number): boolean {
    if (!this.isAcked(a) || a === b) return false
    if (this.history.client[a] === this.history.client[b]) return this.inSession(a, b)
    return this.end(a) + this.slack(a, b) < this.start(b)
  }
}
