/**
 * The one plain sentence of each kind of counter finding, with the numbers in it.
 */
import type { FindingKind } from '../kinds.js'
import type { Teller } from '../telling.js'
import { START, type Tallies } from './tallies.js'

export function counterSentence(
  tallies: Tallies,
  tell: Teller,
  kind: FindingKind,
  q: number,
  r: number,
  least: bigint,
  most: bigint,
): string {
  const value = tallies.count(r)!
  const start = tallies.count(q)!
  const where = tell.keyName
  const from = q === START ? `it started at ${start}` : `${tell.client(q)} had read ${start}`
  const who = `${tell.client(r)} read ${value} from ${where}`
  if (kind === 'backward-counter') {
    return `${where} went back from ${start}, read by ${tell.client(q)}, to ${value}, read by ${tell.client(r)} ${tell.gap(q, r)} later, though nothing decrements it.`
  }
  if (kind === 'lost-increment') {
    const words = tallies.hasDecreases ? 'increments less all possible decrements' : 'acknowledged increments'
    const what =
      tallies.hasDecreases && start + least - value > 0n && least < 0n
        ? 'a decrement was repeated'
        : 'an increment was lost'
    return `${who}, but ${from} and the ${words} between come to at least ${signed(least)}: it should be ${start + least} or more, so ${what} (${start + least - value} too low).`
  }
  const what = tallies.hasDecreases && most < 0n ? 'a decrement was lost' : 'an increment was repeated'
  return `${who}, but ${from} and all increments that could lie between come to at most ${signed(most)}: it should be ${start + most} or less, so ${what} (${value - start - most} too high).`
}

export function notANumberSentence(tell: Teller, r: number): string {
  return `${tell.client(r)} read ${tell.value(tell.key.value[r])} from the counter ${tell.keyName}, which is no whole number.`
}

function signed(n: bigint): string {
  return n < 0n ? `${n}` : `+${n}`
}
