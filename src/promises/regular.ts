import type { PairRule } from './promise.js'

/** A read returns the newest write done before it, or one in flight; two reads may disagree on the latter (Lamport 1986). */
export const regular: PairRule = {
  name: 'regular',
  counterWriteWrite: 'all',
  writeRead: 'all',
  readWrite: 'all',
  readRead: 'none',
}
