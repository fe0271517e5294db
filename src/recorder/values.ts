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

/** The JSON text of a value. Throws TypeError for what JSON or a double cannot hold exactly. */
export function valueText(value: RecordableValue): string {
  if (typeof value === 'bigint') return value.toString()
  if (typeof value === 'number') return numberText(value)
  if (value === null || typeof value === 'boolean' || typeof value === 'string') return JSON.stringify(value)
  if (Array.isArray(value)) return `[${value.map(valueText).join(',')}]`
  if (typeof value === 'object') {
    const members = Object.entries(value).map(
      ([name, member]) => `${JSON.stringify(name)}:${valueText(member)}`,
    )
    return `{${members.join(',')}}`
  }
  throw new TypeError(
    `found ${typeof value} as a value to record, expected JSON or a bigint (null for absence)`,
  )
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
