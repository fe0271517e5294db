/**
 * A clock for stamps: monotonic, anchored once to wall time, in nanoseconds.
 */
const anchorWallNs = BigInt(Date.now()) * 1_000_000n
const anchorMonotonicNs = process.hrtime.bigint()

/** Nanoseconds since the epoch. Never goes back within a process, whatever is done to the wall clock. */
export function nowNs(): bigint {
  return anchorWallNs + (process.hrtime.bigint() - anchorMonotonicNs)
}
