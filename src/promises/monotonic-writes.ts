import type { PairRule } from './promise.js'

/** A client's writes take effect in its order (Terry et al. 1994). Write–write pairs count under every promise, so no pair is added. */
export const monotonicWrites: PairRule = {
  name: 'monotonic-writes',
  counterWriteWrite: 'none',
  writeRead: 'none',
  readWrite: 'none',
  readRead: 'none',
}
