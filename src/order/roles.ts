/**
 * In which role an operation takes part in pairs (semantics.md, "What a single-key promise means").
 */
import { CAS, INCREMENT, NO_VALUE, READ } from '../history/columns.js'
import type { KeyHistory } from './key-history.js'

/** Whether local operation `p` writes: everything but reads and failed cas; unsure ones too. */
export function isWrite(key: KeyHistory, p: number): boolean {
  return key.kind[p] !== READ && !(key.kind[p] === CAS && key.applied[p] === 0 && key.acked[p] === 1)
}

/**
 * Whether local operation `p` reads: an acked read, an acked cas (a failed one without `saw` reads an unknown
 * value), an acked increment that returned its count.
 */
export function isRead(key: KeyHistory, p: number): boolean {
  if (key.acked[p] === 0) return false
  const kind = key.kind[p]
  return kind === READ || kind === CAS || (kind === INCREMENT && key.value[p] !== NO_VALUE)
}

/** The value id that a reading operation of a register key returned, NO_VALUE where it is unknown. */
export function readValue(key: KeyHistory, p: number): number {
  if (key.kind[p] === CAS) return key.applied[p] ? key.extra[p] : key.saw[p]
  return key.value[p]
}
