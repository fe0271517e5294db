/**
 * Values as records carry them: JSON, exact, with big integers written as their digits.
 */

/** What a recorded value may be. Objects and arrays may hold any of these. */
export type RecordableValue =
  | null
  | boolean
  | string
  | number
  | bigint
  | readonly RecordableValue[]
  | { readonly [name: string]: RecordableValue }

/** Readers take records of at most 512 levels, of which the record itself is one. */
const DEPTH_LIMIT = 500

/** The JSON text of a value. Throws TypeError for what JSON or a double cannot hold exactly. */
export function valueText(value: RecordableValue, depth = 0): string {
  if (typeof value === 'string') return JSON.stringify(value)
  if (typeof value === 'bigint') return value.toString()
  if (typeof value === 'number') return numberText(value)
  if (value === null || typeof value === 'boolean') return String(value)
  if (depth === DEPTH_LIMIT)
    throw new TypeError(
      `found a value to record with over ${DEPTH_LIMIT} levels of nesting, or one within itself`,
    )
  if (Array.isArray(value))
    return `[${Array.from(value, (member) => valueText(member, depth + 1)).join(',')}]`
  if (isPlainObject(value)) {
    const members = Object.entries(value).map(
      ([name, member]) => `${JSON.stringify(name)}:${valueText(member, depth + 1)}`,
    )
    return `{${members.join(',')}}`
  }
  throw new TypeError(
    `found ${named(value)} as a value to record, expected JSON or a bigint (null for absence); ` +
      'record the text or the number that it stands for',
  )
}

/** The digits of a whole number. Throws TypeError for anything else; `what` says what it is. */
export function wholeNumberText(what: string, value: unknown): string {
  if (typeof value === 'bigint') return value.toString()
  if (typeof value === 'number' && Number.isInteger(value)) return numberText(value)
  const advice =
    typeof value === 'string' ? '; where the client of the store returns text, pass BigInt(text)' : ''
  throw new TypeError(`found ${shown(value)} as ${what}, expected a whole number or a bigint${advice}`)
}

function numberText(value: number): string {
  if (!Number.isFinite(value))
    throw new TypeError(`found ${value} as a value to record, which JSON cannot hold`)
  if (Number.isInteger(value) && !Number.isSafeInteger(value)) {
    throw new TypeError(
      `found ${value} as a value to record, beyond what a double holds exactly; pass a bigint`,
    )
  }
  return JSON.stringify(value)
}

/** Dates, maps, buffers and the like have members that are not what they hold. */
function isPlainObject(value: unknown): value is { readonly [name: string]: RecordableValue } {
  if (typeof value !== 'object' || value === null) return false
  const prototype = Object.getPrototypeOf(value)
  // An object of another realm (a test runner's sandbox) has that realm's Object.prototype.
  return prototype === null || Object.getPrototypeOf(prototype) === null
}

function named(value: unknown): string {
  if (typeof value !== 'object' || value === null) return typeof value
  return `an instance of ${value.constructor?.name ?? 'a class'}`
}

/** A wrong value in a message, cut short. */
export function shown(value: unknown): string {
  if (typeof value === 'string') return JSON.stringify(value.length > 40 ? `${value.slice(0, 40)}…` : value)
  return typeof value === 'object' && value !== null ? named(value) : String(value)
}
