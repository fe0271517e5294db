/**
 * All single-key promises by name, with the parameters that each takes.
 */
import { boundedStaleness } from './bounded-staleness.js'
import { coherent } from './coherent.js'
import { durable } from './durable.js'
import { linearizable } from './linearizable.js'
import { monotonicReads } from './monotonic-reads.js'
import { monotonicWrites } from './monotonic-writes.js'
import { noLostUpdates } from './no-lost-updates.js'
import type { PairRule, SingleKeyPromiseName } from './promise.js'
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

interface Entry {
  /** parameters that it may have */
  readonly parameters: readonly ParameterName[]
  /** true when it means nothing without one of them */
  readonly needsOne: boolean
  rule(parameters: Parameters): PairRule
}

const plain = (rule: PairRule): Entry => ({ parameters: [], needsOne: false, rule: () => rule })

/** One entry a promise: a missing one does not compile. */
export const SINGLE_KEY: Record<SingleKeyPromiseName, Entry> = {
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
  'no-lost-updates': plain(noLostUpdates),
  regular: plain(regular),
  linearizable: plain(linearizable),
}
