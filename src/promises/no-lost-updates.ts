import type { PairRule } from './promise.js'

/** No two applied writes were computed from one version. Decided by value, not by pairs. */
export const noLostUpdates: PairRule = {
  name: 'no-lost-updates',
  counterWriteWrite: 'none',
  writeRead: 'none',
  readWrite: 'none',
  readRead: 'none',
}
