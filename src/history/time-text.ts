/**
 * Times as records write them: whole or decimal numbers of a unit, or strings of the same, exact to the ns.
 */
import { parseDecimal, toInteger } from './decimal.js'
import type { Instant } from './times.js'

export const UNITS = ['ns', 'us', 'ms', 's'] as const
export type Unit = (typeof UNITS)[number]

/** Powers of ten that turn a unit into nanoseconds. */
const SHIFT: Record<Unit, number> = { ns: 0, us: 3, ms: 6, s: 9 }

/** Nanoseconds in one unit. */
export function unitNs(unit: Unit): bigint {
  return 10n ** BigInt(SHIFT[unit])
}

/** Why a text is no time. */
export type TimeTrouble = 'no-number' | 'too-fine' | 'out-of-range'

const LIMIT = 2n ** 63n

/** Nanoseconds of a number in a unit, exact, or what is wrong with it. Range −2^63 … 2^63 − 1. */
export function timeNs(text: string, unit: Unit): bigint | TimeTrouble {
  const decimal = parseDecimal(text)
  if (!decimal) return 'no-number'
  const ns = toInteger(decimal, SHIFT[unit])
  if (ns === 'fraction') return 'too-fine'
  if (ns === 'huge' || ns >= LIMIT || ns < -LIMIT) return 'out-of-range'
  return ns
}

/** Splits nanoseconds into seconds and nanoseconds. */
export function toInstant(ns: bigint): Instant {
  const nanos = ((ns % 1_000_000_000n) + 1_000_000_000n) % 1_000_000_000n
  return { seconds: Number((ns - nanos) / 1_000_000_000n), nanos: Number(nanos) }
}

/**
 * Reads bytes[from … to), plain digits in nanoseconds, into `into`. The usual case without a string or a big
 * integer: at most 18 digits always fit.
 */
export function readPlainNs(bytes: Uint8Array, from: number, to: number, into: Instant): void {
  let seconds = 0
  let nanos = 0
  const split = to - 9
  for (let i = from; i < split; i++) seconds = seconds * 10 + (bytes[i] - 0x30)
  for (let i = Math.max(from, split); i < to; i++) nanos = nanos * 10 + (bytes[i] - 0x30)
  into.seconds = seconds
  into.nanos = nanos
}

/**
 * Advice for a time outside the range or absurdly placed: the unit under which it would be a date of this
 * century, where there is one.
 */
export function likelyUnit(text: string): Unit | undefined {
  for (const unit of UNITS) {
    const ns = timeNs(text, unit)
    if (typeof ns === 'bigint' && ns > 946_684_800_000_000_000n && ns < 4_102_444_800_000_000_000n)
      return unit
  }
  return undefined
}
