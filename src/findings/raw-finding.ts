/**
 * A finding before records are fetched: its evidence in operation indices of the history.
 */
import type { FindingKind } from './kinds.js'
import type { Margin } from './margin.js'

/** One operation of the evidence. */
export interface Exhibit {
  /** operation index in the history */
  readonly operation: number
  /** what it is in the story, "the overwriting write" */
  readonly role: string
}

/** Why one operation must come before another. Operation indices; links with -1 for the initial value. */
export type Link =
  /** a counted pair: `before` certainly finished before `after` began */
  | { readonly type: 'pair'; readonly before: number; readonly after: number }
  /** the initial value comes before every write */
  | { readonly type: 'initial'; readonly before: -1; readonly after: number }
  /** `after` returned what `before` wrote */
  | { readonly type: 'returned'; readonly before: number; readonly after: number }
  /** `after`, a cas, found the version that `before` wrote (or the initial value): directly after it */
  | { readonly type: 'found'; readonly before: number; readonly after: number }
  /** the same client did `before` first (causal promises: clocks play no part) */
  | { readonly type: 'session'; readonly before: number; readonly after: number }
  /** a read of what `after` wrote already depended on `before`, so agreeing replicas order them so */
  | { readonly type: 'conflict'; readonly before: number; readonly after: number }
  /** `before` returned (or found) a version that `after` overwrote, so it should come before `after` */
  | { readonly type: 'overwritten'; readonly before: number; readonly after: number }

/** Between two counts: what the increments allow. Exact. */
export interface CounterBounds {
  /** operation index of the read that the count starts from; undefined: the start of the history */
  readonly from?: number
  readonly fromCount: bigint
  readonly toCount: bigint
  /** least and most that lie between, as sums of sizes */
  readonly least: bigint
  readonly most: bigint
}

export interface RawFinding {
  readonly kind: FindingKind
  /** other kinds that fit, worst first */
  readonly also: readonly FindingKind[]
  readonly keyId: number
  /** where it spans several keys: all of them */
  readonly keyIds?: readonly number[]
  /** operation index of the blamed operation */
  readonly blamed: number
  /** operation index of the overwriting write, or -1: findings of one cause are told together */
  readonly cause: number
  /** the evidence, in order of time */
  readonly exhibits: readonly Exhibit[]
  readonly links: readonly Link[]
  readonly bounds?: CounterBounds
  readonly summary: string
  /** set once it has been worked out */
  readonly margin?: Margin
}
