/**
 * The distinct values of a history under the format's equality, as canonical JSON text.
 */
import { ByteTable } from './byte-table.js'
import { NULL_VALUE, type Values } from './columns.js'
import { canonicalNumber, parseDecimal, toInteger } from './decimal.js'
import { encodeUtf8 } from './utf8.js'

export class ValueTable implements Values {
  readonly #table = new ByteTable()

  constructor() {
    const id = this.internText('null')
    if (id !== NULL_VALUE) throw new Error('null must be the first value')
  }

  get size(): number {
    return this.#table.size
  }

  text(id: number): string {
    return this.#table.name(id)
  }

  find(text: string): number {
    return this.#table.find(text)
  }

  integer(id: number): bigint | undefined {
    const decimal = parseDecimal(this.text(id))
    if (!decimal) return undefined
    const whole = toInteger(decimal)
    return typeof whole === 'bigint' ? whole : undefined
  }

  /** The id of bytes that are canonical text already. */
  internBytes(bytes: Uint8Array, from: number, to: number): number {
    return this.#table.intern(bytes, from, to)
  }

  /** The id of canonical text. */
  internText(text: string): number {
    const bytes = encodeUtf8(text)
    return this.#table.intern(bytes, 0, bytes.length)
  }
}

/** What keeps a JSON value from being one: a member named twice, a number out of all reason. */
export class ValueTrouble extends Error {
  /** the code of the input problem that it is */
  readonly code: 'duplicate-member' | 'number-out-of-range'
  readonly expected: string

  constructor(code: ValueTrouble['code'], found: string, expected: string) {
    super(found)
    this.code = code
    this.expected = expected
  }
}

/**
 * The canonical text of checked JSON text: no white space, members sorted by name, one spelling of each string
 * and number. Nesting is bounded by the scanner. Throws ValueTrouble.
 */
export function canonicalText(json: string): string {
  const parser = new CanonicalParser(json)
  return parser.value()
}

class CanonicalParser {
  readonly #json: string
  #at = 0

  constructor(json: string) {
    this.#json = json
  }

  value(): string {
    this.#white()
    const c = this.#json[this.#at]
    if (c === '{') return this.#object()
    if (c === '[') return this.#array()
    if (c === '"') return JSON.stringify(this.#string())
    const from = this.#at
    while (this.#at < this.#json.length && !/[\s,\]}]/.test(this.#json[this.#at])) this.#at++
    const token = this.#json.slice(from, this.#at)
    if (token === 'null' || token === 'true' || token === 'false') return token
    const decimal = parseDecimal(token)
    if (!decimal) {
      const start = token.slice(0, 40)
      throw new ValueTrouble(
        'number-out-of-range',
        `a number that begins ${start}… and whose exponent is out of all reason`,
        'an exponent of at most 1000 digits',
      )
    }
    return canonicalNumber(decimal)
  }

  #object(): string {
    const members = new Map<string, string>()
    this.#at++
    this.#white()
    while (this.#json[this.#at] !== '}') {
      if (this.#json[this.#at] === ',') this.#at++
      this.#white()
      const name = this.#string()
      this.#white()
      this.#at++
      if (members.has(name)) {
        throw new ValueTrouble(
          'duplicate-member',
          `the member ${JSON.stringify(name)} twice`,
          'each member of an object once',
        )
      }
      members.set(name, this.value())
      this.#white()
    }
    this.#at++
    const names = [...members.keys()].sort()
    return `{${names.map((name) => `${JSON.stringify(name)}:${members.get(name)}`).join(',')}}`
  }

  #array(): string {
    const items: string[] = []
    this.#at++
    this.#white()
    while (this.#json[this.#at] !== ']') {
      if (this.#json[this.#at] === ',') this.#at++
      items.push(this.value())
      this.#white()
    }
    this.#at++
    return `[${items.join(',')}]`
  }

  #string(): string {
    const from = this.#at
    this.#at++
    while (this.#json[this.#at] !== '"') this.#at += this.#json[this.#at] === '\\' ? 2 : 1
    this.#at++
    return JSON.parse(this.#json.slice(from, this.#at)) as string
  }

  #white(): void {
    while (this.#at < this.#json.length && /\s/.test(this.#json[this.#at])) this.#at++
  }
}
