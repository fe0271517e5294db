/**
 * Whether some operations of a key prove its promise broken: no sequence of them keeps it, and nothing that was left
 * out could have been what one of their reads saw.
 */
import { CAS, DELETE, INCREMENT, NO_VALUE, NULL_VALUE, READ, WRITE } from '../../history/columns.js'
import { EXHAUSTIVE_LIMIT, hasAnyOrder } from './exhaustive.js'
import { Latest } from './latest.js'
import type { Recorded } from './recorded.js'
import type { Rules } from './rules.js'

export type Judgement = 'proved' | 'too-large' | { readonly trouble: string }

/** `all` are the key's operations, refused ones too. */
export function judgeCounterexample(
  recorded: Recorded,
  rules: Rules,
  keyId: number,
  all: readonly number[],
  operations: readonly number[],
): Judgement {
  const { kind } = recorded.history
  const own = new Set(all.filter((i) => recorded.counts(i)))
  const kept = new Set<number>()
  for (const i of operations) {
    if (!own.has(i)) return { trouble: `operation ${i} is none of the key's that count` }
    if (kept.has(i)) return { trouble: `operation ${i} stands in the counterexample twice` }
    kept.add(i)
  }
  if (kept.size > EXHAUSTIVE_LIMIT) return 'too-large'
  const hasIncrements = all.some((i) => kind[i] === INCREMENT)
  const mayBeNoNumber = hasIncrements && mayHoldOther(recorded, keyId, all)
  for (const r of kept) {
    // What found nothing, or did not need to, is not explained by anything.
    const finds = recorded.reads(r) || kind[r] === CAS || (mayBeNoNumber && kind[r] === INCREMENT)
    if (!finds) continue
    const last = new Latest(recorded)
    for (const o of own) {
      if ((kind[o] === WRITE || kind[o] === DELETE) && rules.mustPrecede(o, r)) last.add(o)
    }
    for (const w of own) {
      if (kept.has(w) || !recorded.writes(w) || !mayHaveSeen(recorded, rules, hasIncrements, w, r)) continue
      // Certainly overwritten before r began, where that pair counts.
      if (recorded.isAcked(w) && last.isAfter(w, 0n)) continue
      return { trouble: `operation ${w} was left out, and it may be what operation ${r} saw` }
    }
  }
  return hasAnyOrder(recorded, rules, keyId, all, [...kept])
    ? { trouble: 'its operations can be put in an order that keeps the promise' }
    : 'proved'
}

/** Whether operation r may have found what write w left, by the two alone. */
function mayHaveSeen(
  recorded: Recorded,
  rules: Rules,
  hasIncrements: boolean,
  w: number,
  r: number,
): boolean {
  const { kind, extra } = recorded.history
  const tells = recorded.reads(r) && (recorded.found(r) !== NO_VALUE || kind[r] === INCREMENT)
  if (!hasIncrements) {
    const wanted = recorded.found(r)
    const fits = wanted === NO_VALUE ? recorded.written(w) !== extra[r] : recorded.written(w) === wanted
    if (!fits) return false
  }
  // A read does not precede what it saw; elsewhere that has to be a pair that counts.
  return !(recorded.precedes(r, w) && (tells || rules.mustPrecede(r, w)))
}

/** Whether a key with increments may hold what nothing can be added to. */
function mayHoldOther(recorded: Recorded, keyId: number, all: readonly number[]): boolean {
  const { kind, values, initial, initialUnknown } = recorded.history
  const isOther = (value: number): boolean => value !== NULL_VALUE && values.integer(value) === undefined
  const start = initial.get(keyId)
  // A counter starts with a number.
  if (all.every((i) => kind[i] === READ || kind[i] === INCREMENT)) return false
  if (start === undefined ? initialUnknown : isOther(start)) return true
  return all.some((i) => kind[i] !== READ && kind[i] !== INCREMENT && isOther(recorded.written(i)))
}
