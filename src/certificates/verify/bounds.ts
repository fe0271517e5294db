/**
 * Whether two counts of a counter cannot both be right: more certainly lies between them than the one is above the
 * other, or less than it is.
 */
import { INCREMENT, NO_VALUE, NULL_VALUE, READ } from '../../history/columns.js'
import type { Recorded } from './recorded.js'
import type { Rules } from './rules.js'

/** Why the two prove nothing, or undefined where they prove the counter broken. `from`: -1 for the start. */
export function boundsTrouble(
  recorded: Recorded,
  rules: Rules,
  keyId: number,
  all: readonly number[],
  from: number,
  to: number,
): string | undefined {
  const { kind, value, extra, values, initial, initialUnknown } = recorded.history
  if (all.some((i) => kind[i] !== INCREMENT && kind[i] !== READ)) return 'the key is no counter'
  const isCount = (i: number): boolean => all.includes(i) && recorded.reads(i)
  if (!isCount(to) || (from >= 0 && !isCount(from))) return 'one of them is no count that was read'
  const countOf = (id: number): bigint | undefined => (id === NULL_VALUE ? 0n : values.integer(id))
  const atTo = countOf(value[to])
  if (atTo === undefined) return undefined
  if (from < 0 && initialUnknown && !initial.has(keyId)) return 'the count at the start is not known'
  const atFrom = countOf(from < 0 ? (initial.get(keyId) ?? NULL_VALUE) : value[from])
  if (atFrom === undefined) return 'the count that it is held against is no number'

  const increments = all.filter((i) => kind[i] === INCREMENT && recorded.counts(i))
  const size = (i: number): bigint => values.integer(extra[i])!
  const isAfterFrom = (i: number): boolean => from < 0 || recorded.precedes(from, i)
  // An increment that returned its count is in it.
  const isBeforeTo = (i: number): boolean => i === to || rules.mustPrecede(i, to)
  const surely = increments.filter(
    (i) => i !== from && recorded.isAcked(i) && isAfterFrom(i) && isBeforeTo(i),
  )
  const isSure = new Set(surely)
  const isOut = (i: number): boolean =>
    i === from || (i !== to && ((from >= 0 && rules.mustPrecede(i, from)) || recorded.precedes(to, i)))
  const maybe = increments.filter((i) => !isOut(i) && !isSure.has(i))
  const sum = (some: readonly number[]): bigint => some.reduce((total, i) => total + size(i), 0n)
  const least = sum(surely) + sum(maybe.filter((i) => size(i) < 0n))
  const most = sum(surely) + sum(maybe.filter((i) => size(i) > 0n))
  const grows = increments.every((i) => size(i) >= 0n)
  // That `from` comes first: by an increment between them, by a pair that counts, or since counts do not fall.
  const isOrdered = from < 0 || surely.length > 0 || rules.mustPrecede(from, to) || (grows && atTo > atFrom)

  if (isOrdered && (atTo < atFrom + least || atTo > atFrom + most)) return undefined
  // Two increments that make it grow cannot both have been the one that made it this number.
  const twins = from >= 0 && from !== to && kind[from] === INCREMENT && kind[to] === INCREMENT
  if (twins && grows && atFrom === atTo && size(to) > 0n && size(from) > 0n && value[to] !== NO_VALUE)
    return undefined
  return 'the increments between them allow both counts'
}
