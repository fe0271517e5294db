/**
 * Puts the writes that a search left hidden back into its sequence: each directly before a blind write.
 */
import { DELETE, WRITE } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import { isRead, isWrite } from '../../order/roles.js'
import { mustPrecede } from './agenda.js'

/** The sequence with every acked write in it. O(hidden writes · n). Throws where one has no place: a defect. */
export function withHidden(counting: Counting, sequence: readonly number[]): number[] {
  const { key } = counting
  const whole = [...sequence]
  const placed = new Uint8Array(key.n)
  for (const p of sequence) placed[p] = 1
  // In local order whatever must come before a write is in place before it.
  for (let w = 0; w < key.n; w++) {
    if (placed[w] === 1 || key.acked[w] === 0 || !isWrite(key, w) || isRead(key, w)) continue
    let from = 0
    let to = whole.length
    whole.forEach((p, at) => {
      if (mustPrecede(counting, p, w)) from = at + 1
      if (mustPrecede(counting, w, p) && at < to) to = at
    })
    let at = from
    while (at < whole.length && key.kind[whole[at]] !== WRITE && key.kind[whole[at]] !== DELETE) at++
    if (at > to || at === whole.length)
      throw new Error('a hidden write has no place in the order that the search found')
    whole.splice(at, 0, w)
    placed[w] = 1
  }
  return whole
}
