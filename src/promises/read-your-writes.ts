import type { PairRule } from './promise.js'

/** A client's reads see its own earlier writes (Terry et al. 1994). */
export const readYourWrites: PairRule = {
  name: 'read-your-writes',
  counterWriteWrite: 'none',
  writeRead: 'session',
  readWrite: 'none',
  readRead: 'none',
}
