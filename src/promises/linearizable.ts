import type { PairRule } from './promise.js'

/** Every pair counts (Herlihy and Wing 1990). */
export const linearizable: PairRule = {
  name: 'linearizable',
  counterWriteWrite: 'all',
  writeRead: 'all',
  readWrite: 'all',
  readRead: 'all',
}
