import type { PairRule } from './promise.js'

/** A client's later reads do not go behind its earlier ones (Terry et al. 1994). */
export const monotonicReads: PairRule = {
  name: 'monotonic-reads',
  counterWriteWrite: 'none',
  writeRead: 'none',
  readWrite: 'none',
  readRead: 'session',
}
