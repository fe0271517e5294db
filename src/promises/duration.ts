/** Durations as people write them: 2ms, 1.5s, 10us; exact to the nanosecond. */
import { parseDecimal, toInteger } from '../history/decimal.js'

const UNITS: Record<string, [factor: bigint, shift: number]> = {
  ns: [1n, 0],
  us: [1n, 3],
  ms: [1n, 6],
  s: [1n, 9],
  m: [60n, 9],
  min: [60n, 9],
  h: [3600n, 9],
}

/** Nanoseconds of a duration of 0 or more, or undefined when the text is none (or finer than a nanosecond). */
export function parseDuration(text: string): bigint | undefined {
  const match = /^([0-9.eE+-]+)\s*([a-z]+)$/.exec(text.trim())
  const unit = match ? UNITS[match[2]] : undefined
  if (!match || !unit) return text.trim() === '0' ? 0n : undefined
  const decimal = parseDecimal(match[1])
  if (!decimal || decimal.negative) return undefined
  const [factor, shift] = unit
  const whole = toInteger(decimal, shift)
  return typeof whole === 'bigint' ? whole * factor : undefined
}
