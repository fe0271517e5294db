/**
 * A clock for stamps: monotonic, anchored once to wall time, in nanoseconds.
 */
import { randomBytes } from 'node:crypto'
import { hostname } from 'node:os'

const { wallNs, monotonicNs } = anchor()

/**
 * The name of this clock. One for all recorders of a process (of a worker thread, which anchors a clock of its
 * own), and never that of another process: each anchors for itself, so their stamps differ.
 */
export const CLOCK_NAME = `${hostname()}-${process.pid}-${randomBytes(3).toString('hex')}`

/** Nanoseconds since the epoch. Never goes back within a process, whatever is done to the wall clock. */
export function nowNs(): bigint {
  return wallNs + (process.hrtime.bigint() - monotonicNs)
}

/**
 * Wall time is told in whole milliseconds. Anchored at the moment when it turns over, the clock is right to some
 * microseconds instead of one millisecond. Takes a millisecond, or a few where the process is interrupted.
 */
function anchor(): { wallNs: bigint; monotonicNs: bigint } {
  let best = { wallNs: 0n, monotonicNs: 0n, gapNs: Number.POSITIVE_INFINITY }
  for (let tries = 0; tries < 3 && best.gapNs > 20_000; tries++) {
    const begunNs = process.hrtime.bigint()
    const first = Date.now()
    let lastNs = begunNs
    for (;;) {
      const wallMs = Date.now()
      const atNs = process.hrtime.bigint()
      const gapNs = Number(atNs - lastNs)
      // A clock that a test has stopped never turns over.
      const stands = atNs - begunNs > 5_000_000n
      if (wallMs !== first || stands) {
        if (gapNs < best.gapNs) best = { wallNs: BigInt(wallMs) * 1_000_000n, monotonicNs: atNs, gapNs }
        break
      }
      lastNs = atNs
    }
  }
  return best
}
