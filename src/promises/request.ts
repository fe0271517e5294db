/**
 * What a user asks to have checked.
 */
import type { PairRule } from './promise.js'

export const CAUSAL_PROMISES = ['causal', 'causal-convergence'] as const
export type CausalName = (typeof CAUSAL_PROMISES)[number]

interface Asked {
  /** as the result calls it; unique among the requests */
  readonly name: string
  /** as the result shows them */
  readonly parameters: Readonly<Record<string, string | number>>
  /** glob of the keys it is claimed for */
  readonly keys: string
  /** where it stands in a promises file */
  readonly place?: { readonly file: string; readonly line: number }
}

/** A promise that is decided key by key. */
export interface KeyPromiseRequest extends Asked {
  readonly rule: PairRule
  readonly causal?: undefined
}

/** A promise that is decided over all its keys at once. */
export interface CausalPromiseRequest extends Asked {
  readonly causal: CausalName
  readonly rule?: undefined
}

export type PromiseRequest = KeyPromiseRequest | CausalPromiseRequest
