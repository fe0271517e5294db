/**
 * Times and spans as foreign logs write them, exact to the nanosecond.
 */
import { parseDecimal, toInteger } from '../history/decimal.js'
import { type Unit, unitNs } from '../history/time-text.js'

/**
 * Nanoseconds, rounded down and up; both equal unless the text is finer than a nanosecond.
 */
export interface Nanoseconds {
  readonly floor: bigint
  readonly ceil: bigint
}

/** What keeps a text from being a time: what was expected instead, and what to do. */
export class TimeTrouble extends Error {
  readonly expected: string
  readonly advice: string | undefined

  constructor(expected: string, advice?: string) {
    super(expected)
    this.expected = expected
    this.advice = advice
  }
}

const LIMIT = 2n ** 63n

/** Whether a count of nanoseconds is one that a history can hold. */
export function isInRange(ns: bigint): boolean {
  return ns >= -LIMIT && ns < LIMIT
}

/** A number in a unit: whole or decimal, exponents allowed. Throws TimeTrouble. */
export function parseCount(text: string, unit: Unit): Nanoseconds {
  const decimal = parseDecimal(text)
  if (!decimal) throw new TimeTrouble(`a number of ${unit}`, adviceOf(text))
  const whole = toInteger(decimal, SHIFT[unit])
  if (whole === 'huge') throw new TimeTrouble('a time within 2^63 ns of 1970', 'name the right unit')
  if (whole !== 'fraction') return { floor: whole, ceil: whole }
  // Finer than a nanosecond: what stands before the point, by ten at a time.
  const places = -(decimal.exponent + BigInt(SHIFT[unit]))
  const size = places >= BigInt(decimal.digits.length) ? 0n : BigInt(decimal.digits.slice(0, -Number(places)))
  return decimal.negative ? { floor: -size - 1n, ceil: -size } : { floor: size, ceil: size + 1n }
}

const SHIFT: Record<Unit, number> = { ns: 0, us: 3, ms: 6, s: 9 }

function adviceOf(text: string): string | undefined {
  return STAMP.test(text) ? 'write unit: iso for timestamps such as this one' : undefined
}

/** RFC 3339, with the comma and the space that ISO 8601 and people allow. */
const STAMP =
  /^([0-9]{4})-([0-9]{2})-([0-9]{2})[Tt ]([0-9]{2}):([0-9]{2}):([0-9]{2})(?:[.,]([0-9]+))?([Zz]|[+-][0-9]{2}:?[0-9]{2})?$/

/**
 * A timestamp by RFC 3339 (the profile of ISO 8601 for the Internet), since 1970-01-01T00:00:00Z without leap
 * seconds. Throws TimeTrouble, also for one without offset: whose noon it is cannot be guessed.
 */
export function parseTimestamp(text: string): Nanoseconds {
  const match = STAMP.exec(text)
  if (!match)
    throw new TimeTrouble(
      'a timestamp such as 2024-07-01T20:00:00.123456789Z',
      parseDecimal(text) ? 'write unit: s, ms, us or ns for numbers' : undefined,
    )
  const [, year, month, day, hour, minute, second, fraction = '', offset] = match
  if (offset === undefined)
    throw new TimeTrouble(
      'an offset from UTC at its end, Z or +02:00',
      'add it: template "{…}Z" if the clock runs on UTC',
    )
  if (second === '60')
    throw new TimeTrouble('a second of 00 to 59', 'a leap second has no number of its own in Unix time')
  const days = daysSince1970(Number(year), Number(month), Number(day))
  const isDay =
    Number(month) >= 1 &&
    Number(month) <= 12 &&
    Number(day) >= 1 &&
    Number(day) <= lengthOfMonth(Number(year), Number(month))
  const [offsetHours, offsetMinutes] = /[Zz]/.test(offset)
    ? [0, 0]
    : [Number(offset.slice(1, 3)), Number(offset.slice(-2))]
  if (
    !isDay ||
    Number(hour) > 23 ||
    Number(minute) > 59 ||
    Number(second) > 59 ||
    offsetHours > 23 ||
    offsetMinutes > 59
  )
    throw new TimeTrouble('a day and a time of day that exist')
  const east = (offset[0] === '-' ? -1 : 1) * (offsetHours * 60 + offsetMinutes)
  const seconds = days * 86_400 + Number(hour) * 3600 + (Number(minute) - east) * 60 + Number(second)
  const nanos = BigInt(fraction.slice(0, 9).padEnd(9, '0'))
  const floor = BigInt(seconds) * unitNs('s') + nanos
  return { floor, ceil: /[1-9]/.test(fraction.slice(9)) ? floor + 1n : floor }
}

function lengthOfMonth(year: number, month: number): number {
  if (month === 2) return (year % 4 === 0 && year % 100 !== 0) || year % 400 === 0 ? 29 : 28
  return [4, 6, 9, 11].includes(month) ? 30 : 31
}

/** Days of the proleptic Gregorian calendar, by counting leap years; years begin in March so that February's end is theirs. */
function daysSince1970(year: number, month: number, day: number): number {
  const shifted = month > 2 ? year : year - 1
  const fromMarch = (month + 9) % 12
  const leaps = Math.floor(shifted / 4) - Math.floor(shifted / 100) + Math.floor(shifted / 400)
  return shifted * 365 + leaps + Math.floor((153 * fromMarch + 2) / 5) + day - 1 - 719_468
}
