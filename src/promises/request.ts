/**
 * What a user asks to have checked.
 */
import type { PairRule } from './promise.js'

export interface PromiseRequest {
  /** as the result calls it; unique among the requests */
  readonly name: string
  readonly rule: PairRule
  /** as the result shows them */
  readonly parameters: Readonly<Record<string, string | number>>
  /** glob of the keys it is claimed for */
  readonly keys: string
  /** where it stands in a promises file */
  readonly place?: { readonly file: string; readonly line: number }
}
