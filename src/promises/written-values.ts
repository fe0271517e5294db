import type { PairRule } from './promise.js'

/** Reads return values that somebody wrote, in some order of the writes that real time allows. No pair with a read counts. */
export const writtenValues: PairRule = {
  name: 'written-values',
  counterWriteWrite: 'none',
  writeRead: 'none',
  readWrite: 'none',
  readRead: 'none',
}
