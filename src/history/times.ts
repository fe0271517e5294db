/**
 * The start and end of every operation, exact to the nanosecond.
 *
 * Times lie anywhere in ±2^63 ns, a double holds whole numbers to 2^53. So the columns are nanoseconds after
 * the first time that was added, in doubles, as long as every one of them is within 2^52 ns (52 days) of it;
 * from the first time further away they are 64-bit integers.
 */

/** Whole seconds for which nanoseconds after the base stay within 2^52. */
const NARROW_SECONDS = 4_503_599
const NANOS = 1_000_000_000

export interface Times {
  /** Nanoseconds since the epoch that offsets count from; 0n while there are no operations. */
  readonly baseNs: bigint
  /** Offsets from `baseNs` in nanoseconds, exact; undefined when some time is over 52 days from it. */
  readonly startOffset: Float64Array | undefined
  readonly endOffset: Float64Array | undefined
  startNs(i: number): bigint
  /** The end; meaningless where the history's `hasEnd` is 0. */
  endNs(i: number): bigint
}

/**
 * A time as two whole numbers that doubles hold exactly: seconds (rounded down) and nanoseconds 0 … 999,999,999.
 */
export interface Instant {
  seconds: number
  nanos: number
}

/** The nanoseconds since the epoch of an instant. */
export function instantNs({ seconds, nanos }: Instant): bigint {
  return BigInt(seconds) * 1_000_000_000n + BigInt(nanos)
}

/** Growing columns of times. */
export class TimesBuilder implements Times {
  readonly #base: Instant = { seconds: 0, nanos: 0 }
  #count = 0
  #narrowStart: Float64Array | undefined = new Float64Array(1024)
  #narrowEnd: Float64Array | undefined = new Float64Array(1024)
  #wideStart = new BigInt64Array(0)
  #wideEnd = new BigInt64Array(0)

  get baseNs(): bigint {
    return instantNs(this.#base)
  }

  get startOffset(): Float64Array | undefined {
    return this.#narrowStart
  }

  get endOffset(): Float64Array | undefined {
    return this.#narrowEnd
  }

  startNs(i: number): bigint {
    return this.#narrowStart ? this.baseNs + BigInt(this.#narrowStart[i]) : this.#wideStart[i]
  }

  endNs(i: number): bigint {
    return this.#narrowEnd ? this.baseNs + BigInt(this.#narrowEnd[i]) : this.#wideEnd[i]
  }

  /** Adds the times of the next operation; without an end pass its start. */
  push(start: Instant, end: Instant): void {
    if (this.#count === 0) {
      this.#base.seconds = start.seconds
      this.#base.nanos = start.nanos
    }
    const i = this.#count++
    if (this.#narrowStart && this.#narrowEnd) {
      if (i === this.#narrowStart.length) {
        this.#narrowStart = grown(this.#narrowStart, new Float64Array(i * 2))
        this.#narrowEnd = grown(this.#narrowEnd, new Float64Array(i * 2))
      }
      if (this.#isNarrow(start)) this.#narrowStart[i] = this.#offset(start)
      else this.#widen()
    } else if (i === this.#wideStart.length) {
      this.#wideStart = grown(this.#wideStart, new BigInt64Array(i * 2))
      this.#wideEnd = grown(this.#wideEnd, new BigInt64Array(i * 2))
    }
    if (!this.#narrowStart) this.#wideStart[i] = instantNs(start)
    this.setEnd(i, end)
  }

  /** Replaces the end of operation `i` (its closing half has come). */
  setEnd(i: number, end: Instant): void {
    if (this.#narrowEnd) {
      if (this.#isNarrow(end)) {
        this.#narrowEnd[i] = this.#offset(end)
        return
      }
      this.#widen()
    }
    this.#wideEnd[i] = instantNs(end)
  }

  #isNarrow({ seconds }: Instant): boolean {
    return Math.abs(seconds - this.#base.seconds) < NARROW_SECONDS
  }

  #offset({ seconds, nanos }: Instant): number {
    return (seconds - this.#base.seconds) * NANOS + (nanos - this.#base.nanos)
  }

  #widen(): void {
    const starts = this.#narrowStart!
    const ends = this.#narrowEnd!
    this.#wideStart = new BigInt64Array(starts.length)
    this.#wideEnd = new BigInt64Array(ends.length)
    const base = this.baseNs
    for (let i = 0; i < this.#count; i++) {
      this.#wideStart[i] = base + BigInt(starts[i])
      this.#wideEnd[i] = base + BigInt(ends[i])
    }
    this.#narrowStart = undefined
    this.#narrowEnd = undefined
  }
}

function grown<A extends Float64Array | BigInt64Array>(old: A, larger: A): A {
  larger.set(old as never)
  return larger
}
