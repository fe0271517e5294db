import type { PairRule } from './promise.js'

/** Every client sees the key change in one order that its own operations agree with (coherence per location). */
export const coherent: PairRule = {
  name: 'coherent',
  counterWriteWrite: 'session',
  writeRead: 'session',
  readWrite: 'session',
  readRead: 'session',
}
