/**
 * What is wrong with one record of a log; the conversion turns it into a problem at the record's place.
 */
export class RowTrouble extends Error {
  /** stable, kebab-case */
  readonly code: string
  readonly found: string
  readonly expected: string
  readonly advice: string | undefined

  constructor(code: string, found: string, expected: string, advice?: string) {
    super(`found ${found}, expected ${expected}`)
    this.code = code
    this.found = found
    this.expected = expected
    this.advice = advice
  }
}

/** A text in quotes, cut short. */
export function quoted(text: string): string {
  return JSON.stringify(text.length > 40 ? `${text.slice(0, 40)}…` : text)
}
