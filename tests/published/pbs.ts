/**
 * Probabilistically bounded staleness (Bailis, Venkataraman, Franklin, Hellerstein, Stoica, PVLDB 5(8), 2012): with n
 * replicas, read quorums of r and write quorums of w chosen at random, the share of reads that miss the last write,
 * and that return one of the last k versions. Checked against the authors' draft; recomputed.
 */
export interface QuorumCase {
  readonly n: number
  readonly r: number
  readonly w: number
  /** probability that a read quorum misses the last write */
  readonly misses: number
  /** k → probability of returning one of the last k versions */
  readonly within: ReadonlyMap<number, number>
}

const quorum = (
  n: number,
  r: number,
  w: number,
  misses: number,
  within: Record<number, number> = {},
): QuorumCase => ({
  n,
  r,
  w,
  misses,
  within: new Map(Object.entries(within).map(([k, share]) => [Number(k), share])),
})

export const QUORUMS: readonly QuorumCase[] = [
  quorum(3, 1, 1, 2 / 3, { 1: 0.333333, 2: 0.555556, 3: 0.703704, 5: 0.868313, 10: 0.982658 }),
  quorum(3, 1, 2, 1 / 3, { 1: 0.666667, 2: 0.888889, 3: 0.962963, 5: 0.995885, 10: 0.999983 }),
  quorum(3, 2, 1, 1 / 3, { 1: 0.666667, 2: 0.888889, 3: 0.962963, 5: 0.995885, 10: 0.999983 }),
  quorum(100, 30, 30, 1.884349e-6),
  quorum(2, 1, 1, 0.5, { 1: 0.5, 2: 0.75, 3: 0.875, 5: 0.96875, 10: 0.999023 }),
  quorum(5, 2, 2, 0.3, { 1: 0.7, 2: 0.91, 3: 0.973, 5: 0.99757, 10: 0.999994 }),
  quorum(5, 2, 3, 0.1, { 1: 0.9, 2: 0.99, 3: 0.999, 5: 0.99999 }),
  quorum(3, 2, 2, 0, { 1: 1 }),
]

/**
 * One write and a read t after its commit, three replicas, read and write quorums of one; all delays exponential,
 * acknowledgement, request and response of mean 1 ms. Shares of consistent reads; the paper's, and re-simulated.
 */
export const DELAYS: readonly {
  readonly meanWriteMs: number
  readonly afterMs: number
  readonly paper: number
  readonly again: number
}[] = [
  { meanWriteMs: 0.25, afterMs: 0, paper: 0.94, again: 0.943 },
  { meanWriteMs: 0.25, afterMs: 1, paper: 0.999, again: 0.999 },
  { meanWriteMs: 10, afterMs: 0, paper: 0.41, again: 0.42 },
  { meanWriteMs: 10, afterMs: 65, paper: 0.999, again: 0.999 },
]
