/**
 * All single-key promises by name, with the parameters that each takes.
 */
import { boundedStaleness } from './bounded-staleness.js'
import { coherent } from './coherent.js'
import { durable } from './durable.js'
import { linearizable } from './linearizable.js'
import { monotonicReads } from './monotonic-reads.js'
import { monotonicWrites } from './monotonic-writes.js'
import type { PairRule } from './promise.js'
import { readYourWrites } from './read-your-writes.js'
import { regular } from './regular.js'
import { writesFollowReads } from './writes-follow-reads.js'
import { writtenValues } from './written-values.js'

/** Parameters as they were given: durations in nanoseconds, counts. */
export interface Parameters {
  readonly within?: bigint
  readonly versions?: number
  readonly settle?: bigint
}
export type ParameterName = keyof Parameters

/** Promises that are decided pair by pair; `no-lost-updates` and the causal ones have deciders of their own. */
export type PairPromiseName =
  | 'written-values'
  | 'read-your-writes'
  | 'monotonic-reads'
  | 'monotonic-writes'
  | 'writes-follow-reads'
  | 'coherent'
  | 'bounded-staleness'
  | 'durable'
  | 'regular'
  | 'linearizable'

interface Entry {
  /** parameters that it may have */
  readonly parameters: readonly ParameterName[]
  /** true when it means nothing without one of them */
  readonly needsOne: boolean
  rule(parameters: Parameters): PairRule
}

const plain = (rule: PairRule): Entry => ({ parameters: [], needsOne: false, rule: () => rule })

/** One entry a promise: a missing one does not compile. */
export const PAIR_PROMISES: Record<PairPromiseName, Entry> = {
  'written-values': plain(writtenValues),
  'read-your-writes': plain(readYourWrites),
  'monotonic-reads': plain(monotonicReads),
  'monotonic-writes': plain(monotonicWrites),
  'writes-follow-reads': plain(writesFollowReads),
  coherent: plain(coherent),
  'bounded-staleness': {
    parameters: ['within', 'versions'],
    needsOne: true,
    rule: ({ within, versions }) =>
      boundedStaleness({
        ...(within === undefined ? {} : { withinNs: within }),
        ...(versions === undefined ? {} : { versions }),
      }),
  },
  durable: { parameters: ['settle'], needsOne: false, rule: ({ settle }) => durable(settle) },
  regular: plain(regular),
  linearizable: plain(linearizable),
}
