/**
 * Whether a handful of operations can be put in any sequence at all that keeps a promise: every one is tried.
 */
import { INCREMENT, NO_VALUE, READ } from '../../history/columns.js'
import { Copy, type Held } from './copy.js'
import type { Recorded } from './recorded.js'
import type { Rules } from './rules.js'

/** Most operations that are tried: some hundred thousand states. */
export const EXHAUSTIVE_LIMIT = 18

/** `operations` are the ones to order, unsure ones only where they help; `all` are the key's, refused ones too. */
export function hasAnyOrder(
  recorded: Recorded,
  rules: Rules,
  keyId: number,
  all: readonly number[],
  operations: readonly number[],
): boolean {
  const n = operations.length
  const { kind } = recorded.history
  const copy = new Copy(recorded, keyId, all)
  const hasIncrements = all.some((i) => kind[i] === INCREMENT)
  const isMixed = hasIncrements && all.some((i) => kind[i] !== INCREMENT && kind[i] !== READ)
  let acked = 0
  const before = operations.map((b, at) => {
    if (recorded.isAcked(b)) acked |= 1 << at
    return operations.reduce((set, a, bit) => (rules.mustPrecede(a, b) ? set | (1 << bit) : set), 0)
  })
  const seen = new Set<string>()

  const extend = (placed: number, held: Held, lastWrite: number, since: readonly number[]): boolean => {
    if ((acked & ~placed) === 0) return true
    const state = `${placed} ${copy.name(held)} ${lastWrite} ${isMixed ? since.join() : ''}`
    if (seen.has(state)) return false
    seen.add(state)
    for (let at = 0; at < n; at++) {
      // Whatever must come before it is placed, or is unsure and left out for good.
      if ((placed & (1 << at)) !== 0 || (before[at] & ~placed & acked) !== 0) continue
      // Nothing that is placed may have to come after it.
      if (operations.some((_, other) => (placed & (1 << other)) !== 0 && (before[other] & (1 << at)) !== 0))
        continue
      const i = operations[at]
      const next = copy.after(held, i)
      if (!next) continue
      if (recorded.reads(i) && (recorded.found(i) !== NO_VALUE || kind[i] === INCREMENT)) {
        if (lastWrite >= 0 && recorded.precedes(i, lastWrite)) continue
        if (isMixed && since.some((s) => recorded.precedes(i, s))) continue
        if (!rules.isFresh(lastWrite, i)) continue
      }
      const sets = recorded.writes(i) && kind[i] !== INCREMENT
      const adds = isMixed && kind[i] === INCREMENT
      const now = sets ? [] : adds ? [...since, i].sort((a, b) => a - b) : since
      if (extend(placed | (1 << at), next, sets ? i : lastWrite, now)) return true
    }
    return false
  }
  return extend(0, copy.start(), -1, [])
}
