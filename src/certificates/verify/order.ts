/**
 * Whether a sequence of one key's operations keeps a promise: every acked operation is in it once, a single copy would
 * answer so, and no counted pair stands the wrong way round. One pass.
 */
import { INCREMENT, NO_VALUE, READ } from '../../history/columns.js'
import { Copy } from './copy.js'
import { Latest } from './latest.js'
import type { Recorded } from './recorded.js'
import type { Rules } from './rules.js'

/** Why the order proves nothing, or undefined where it proves the promise kept. `all`: refused operations too. */
export function orderTrouble(
  recorded: Recorded,
  rules: Rules,
  keyId: number,
  all: readonly number[],
  order: readonly number[],
): string | undefined {
  const own = new Set(all.filter((i) => recorded.counts(i)))
  const placed = new Set<number>()
  for (const i of order) {
    if (!own.has(i)) return `operation ${i} is none of the key's that count`
    if (placed.has(i)) return `operation ${i} stands in the order twice`
    placed.add(i)
  }
  for (const i of own)
    if (recorded.isAcked(i) && !placed.has(i)) return `acked operation ${i} is missing in the order`
  return answersTrouble(recorded, rules, keyId, all, order) ?? pairsTrouble(recorded, rules, order)
}

/** Whether a single copy, one request at a time, answers as recorded; and whether nobody reads the future. */
function answersTrouble(
  recorded: Recorded,
  rules: Rules,
  keyId: number,
  all: readonly number[],
  order: readonly number[],
): string | undefined {
  const copy = new Copy(recorded, keyId, all)
  const { kind } = recorded.history
  const isMixed =
    all.some((i) => kind[i] === INCREMENT) && all.some((i) => kind[i] !== INCREMENT && kind[i] !== READ)
  let held = copy.start()
  let lastWrite = -1
  let since = new Latest(recorded)
  for (const i of order) {
    const next = copy.after(held, i)
    if (!next) return `operation ${i} could not have been answered so at its place in the order`
    held = next
    const tells = recorded.reads(i) && (recorded.found(i) !== NO_VALUE || kind[i] === INCREMENT)
    if (tells) {
      if (lastWrite >= 0 && recorded.precedes(i, lastWrite))
        return `operation ${i} read what ${lastWrite} wrote later`
      if (isMixed && since.isAfter(i, 0n)) return `operation ${i} read an increment that began later`
      if (!rules.isFresh(lastWrite, i))
        return `operation ${i} read more than ${rules.claimed.versions} versions behind`
    }
    if (!recorded.writes(i)) continue
    if (kind[i] === INCREMENT) since.add(i)
    else {
      lastWrite = i
      since = new Latest(recorded)
    }
  }
  return undefined
}

/** No operation may stand after one that it must precede: of those before it, the latest starts are enough to see. */
function pairsTrouble(recorded: Recorded, rules: Rules, order: readonly number[]): string | undefined {
  const writes = new Latest(recorded)
  const reads = new Latest(recorded)
  const closing = new Latest(recorded)
  for (const a of order) {
    if (recorded.isAcked(a)) {
      for (const aWrites of [true, false]) {
        if (!(aWrites ? recorded.writes(a) : recorded.reads(a))) continue
        for (const bWrites of [true, false]) {
          const which = rules.which(aWrites, bWrites)
          if (which === 'none') continue
          const before = bWrites ? writes : which === 'closing' ? closing : reads
          const isWrong =
            which === 'session'
              ? before.isLaterInSession(a)
              : before.isAfter(a, which === 'late' ? rules.withinNs : 0n, which === 'late')
          if (isWrong) return `operation ${a} must come before one that stands before it in the order`
        }
      }
    }
    if (recorded.writes(a)) writes.add(a)
    if (!recorded.reads(a)) continue
    reads.add(a)
    if (rules.row.writeRead === 'closing' && rules.isClosing(a)) closing.add(a)
  }
  return undefined
}
