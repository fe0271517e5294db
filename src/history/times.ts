/**
 * The start and end of every operation, exact to the nanosecond.
 *
 * Times lie anywhere in ±2^63 ns, a double holds whole numbers to 2^53. So the columns are nanoseconds after
 * the first time that was added, in doubles, as long as every one of them is exact there (104 days); from the
 * first time further away they are 64-bit integers.
 */

/** The largest offset in nanoseconds, either way, for which sums of two stay exact in a double. */
const NARROW_LIMIT = 2 ** 52

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

/** Growing columns of times. */
export class TimesBuilder implements Times {
  baseNs = 0n
  #count = 0
  #narrowStart: Float64Array | undefined = new Float64Array(1024)
  #narrowEnd: Float64Array | undefined = new Float64Array(1024)
  #wideStart = new BigInt64Array(0)
  #wideEnd = new BigInt64Array(0)

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
  push(startNs: bigint, endNs: bigint): void {
    if (this.#count === 0) this.baseNs = startNs
    const i = this.#count++
    if (this.#narrowStart && this.#narrowEnd) {
      if (i === this.#narrowStart.length) {
        this.#narrowStart = grown(this.#narrowStart, new Float64Array(i * 2))
        this.#narrowEnd = grown(this.#narrowEnd, new Float64Array(i * 2))
      }
    } else if (i === this.#wideStart.length) {
      this.#wideStart = grown(this.#wideStart, new BigInt64Array(i * 2))
      this.#wideEnd = grown(this.#wideEnd, new BigInt64Array(i * 2))
    }
    this.#setStart(i, startNs)
    this.setEnd(i, endNs)
  }

  /** Replaces the end of operation `i` (its closing half has come). */
  setEnd(i: number, endNs: bigint): void {
    if (this.#narrowEnd) {
      const offset = endNs - this.baseNs
      if (isNarrow(offset)) {
        this.#narrowEnd[i] = Number(offset)
        return
      }
      this.#widen()
    }
    this.#wideEnd[i] = endNs
  }

  #setStart(i: number, startNs: bigint): void {
    if (this.#narrowStart) {
      const offset = startNs - this.baseNs
      if (isNarrow(offset)) {
        this.#narrowStart[i] = Number(offset)
        return
      }
      this.#widen()
    }
    this.#wideStart[i] = startNs
  }

  #widen(): void {
    const starts = this.#narrowStart!
    const ends = this.#narrowEnd!
    this.#wideStart = new BigInt64Array(starts.length)
    this.#wideEnd = new BigInt64Array(ends.length)
    for (let i = 0; i < this.#count; i++) {
      this.#wideStart[i] = this.baseNs + BigInt(starts[i])
      this.#wideEnd[i] = this.baseNs + BigInt(ends[i])
    }
    this.#narrowStart = undefined
    this.#narrowEnd = undefined
  }
}

function isNarrow(offset: bigint): boolean {
  return offset <= NARROW_LIMIT && offset >= -NARROW_LIMIT
}

function grown<A extends Float64Array | BigInt64Array>(old: A, larger: A): A {
  larger.set(old as never)
  return larger
}
