import type { PairRule } from './promise.js'

/** A client's writes come after what it read before them (Terry et al. 1994). */
export const writesFollowReads: PairRule = {
  name: 'writes-follow-reads',
  counterWriteWrite: 'none',
  writeRead: 'none',
  readWrite: 'session',
  readRead: 'none',
}
