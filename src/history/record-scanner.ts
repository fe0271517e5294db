/**
 * Scans one line as a JSON object, strictly by RFC 8259, and notes where the members that the format knows stand.
 *
 * The result lives in flat arrays indexed by field (`F`), reused from line to line; values stay bytes until
 * somebody needs them. Unknown members are checked and skipped.
 */
import { decodeUtf8, isUtf8 } from './utf8.js'

/** Fields of all kinds of record, in the order of the arrays. */
export const FIELDS = [
  'history',
  'title',
  'unit',
  'clockError',
  'initial',
  'initialUnknown',
  'mark',
  'id',
  'client',
  'host',
  'op',
  'key',
  'value',
  'by',
  'expect',
  'applied',
  'saw',
  'start',
  'end',
  'outcome',
  'basis',
  'dump',
  'time',
  'complete',
] as const
export type FieldName = (typeof FIELDS)[number]

/** Field → its index in the arrays of `ScannedRecord`. */
export const F = Object.fromEntries(FIELDS.map((name, i) => [name, i])) as Record<FieldName, number>

/** What stands at a field. */
export const ABSENT = 0
export const STRING = 1
export const NUMBER = 2
export const TRUE = 3
export const FALSE = 4
export const NULL = 5
export const OBJECT = 6
export const ARRAY = 7
export const TYPE_NAMES = [
  'nothing',
  'a string',
  'a number',
  'true',
  'false',
  'null',
  'an object',
  'an array',
]

/** Deepest nesting that is read. */
export const DEPTH_LIMIT = 512

/** Unknown names of a record that are compared one by one. */
const FEW = 8

/** Why a line is no record. `at` is a byte offset in the scanned array. */
export interface ScanFailure {
  readonly code: 'not-json' | 'duplicate-member' | 'too-deep' | 'nul-byte' | 'invalid-utf-8'
  readonly at: number
  readonly expected: string
}

/** Field → its name as bytes. */
const FIELD_BYTES = FIELDS.map((name) => new TextEncoder().encode(name))

/** The same by length. */
const BY_LENGTH: { field: number; bytes: Uint8Array }[][] = []
for (const [field, bytes] of FIELD_BYTES.entries()) {
  BY_LENGTH[bytes.length] ??= []
  BY_LENGTH[bytes.length].push({ field, bytes })
}

export class RecordScanner {
  /** field → ABSENT … ARRAY */
  readonly type = new Uint8Array(FIELDS.length)
  /** field → first byte of the value; of a string, after its quote */
  readonly from = new Int32Array(FIELDS.length)
  /** field → byte after the value; of a string, its closing quote */
  readonly to = new Int32Array(FIELDS.length)
  /** field → 1 for a string with escapes, or a number with a sign, point or exponent */
  readonly special = new Uint8Array(FIELDS.length)
  /** the array that was scanned last */
  bytes: Uint8Array = new Uint8Array(0)
  /** the failure of the last scan that failed */
  failure: ScanFailure = { code: 'not-json', at: 0, expected: '' }

  #at = 0
  #end = 0
  #special = 0
  /** members seen in this record so far */
  #member = 0
  /** place of a member in its record → the field that stood there last */
  readonly #order = new Int32Array(16).fill(-1)
  /** names that the format does not know, none with an escape, until `#unknownNames` takes over */
  readonly #unknownFrom = new Int32Array(FEW)
  readonly #unknownTo = new Int32Array(FEW)
  #unknown = 0
  /** all of them, where there are many or one has an escape */
  #unknownNames: Set<string> | undefined
  readonly #containers = new Uint8Array(DEPTH_LIMIT + 1)

  /** Scans bytes[from … to) as one record. False: see `failure`. */
  scan(bytes: Uint8Array, from: number, to: number): boolean {
    this.bytes = bytes
    this.#at = from
    this.#end = to
    this.type.fill(ABSENT)
    this.#unknown = 0
    this.#unknownNames = undefined
    this.#member = 0
    if (!this.#object()) return this.#blame(from, to)
    this.#white()
    if (this.#at < to) {
      this.#fail('not-json', this.#at, 'the end of the line after the record')
      return this.#blame(from, to)
    }
    return true
  }

  /** The text of a string field. */
  text(field: number): string {
    return this.special[field]
      ? unescaped(this.bytes, this.from[field], this.to[field])
      : decodeUtf8(this.bytes, this.from[field], this.to[field])
  }

  /** The bytes of a field as they stand, quotes included, decoded. */
  raw(field: number): string {
    const quote = this.type[field] === STRING ? 1 : 0
    return decodeUtf8(this.bytes, this.from[field] - quote, this.to[field] + quote)
  }

  /** NUL bytes and bad UTF-8 are worse than what they made the scan stumble over. */
  #blame(from: number, to: number): false {
    const nul = this.bytes.subarray(from, to).indexOf(0)
    if (nul >= 0) this.#fail('nul-byte', from + nul, 'text without NUL bytes')
    else if (!isUtf8(this.bytes, from, to)) this.#fail('invalid-utf-8', this.#at, 'valid UTF-8')
    return false
  }

  #fail(code: ScanFailure['code'], at: number, expected: string): false {
    this.failure = { code, at, expected }
    return false
  }

  #white(): number {
    const bytes = this.bytes
    let at = this.#at
    const end = this.#end
    while (at < end) {
      const c = bytes[at]
      if (c !== 0x20 && c !== 0x09 && c !== 0x0d && c !== 0x0a) break
      at++
    }
    this.#at = at
    return at < end ? bytes[at] : -1
  }

  #object(): boolean {
    if (this.#white() !== 0x7b) return this.#fail('not-json', this.#at, 'a JSON object')
    this.#at++
    if (this.#white() === 0x7d) {
      this.#at++
      return true
    }
    for (;;) {
      if (this.#white() !== 0x22) return this.#fail('not-json', this.#at, 'a member name in quotes')
      const nameFrom = this.#at + 1
      if (!this.#string()) return false
      const field = this.#fieldOf(nameFrom, this.#at - 1)
      if (field === DUPLICATE) return this.#fail('duplicate-member', nameFrom - 1, 'each member once')
      if (this.#white() !== 0x3a) return this.#fail('not-json', this.#at, 'a colon')
      this.#at++
      const c = this.#white()
      const start = this.#at
      this.#special = 0
      const type = this.#value(c)
      if (type === ABSENT) return false
      if (field >= 0) {
        if (this.type[field] !== ABSENT)
          return this.#fail('duplicate-member', nameFrom - 1, 'each member once')
        const quote = type === STRING ? 1 : 0
        this.type[field] = type
        this.from[field] = start + quote
        this.to[field] = this.#at - quote
        this.special[field] = this.#special
      }
      const next = this.#white()
      this.#at++
      if (next === 0x7d) return true
      if (next !== 0x2c) return this.#fail('not-json', this.#at - 1, 'a comma or the end of the object')
    }
  }

  /** The field with this name, UNKNOWN, or DUPLICATE for an unknown name that was there before. */
  #fieldOf(from: number, to: number): number {
    // Records of one recorder have their members in one order.
    const member = this.#member++
    const guess = this.#order[member]
    if (guess >= 0 && this.#special === 0 && this.#isNamed(guess, from, to)) return guess
    const field = this.#findField(from, to)
    if (member < this.#order.length) this.#order[member] = field
    return field
  }

  #isNamed(field: number, from: number, to: number): boolean {
    const name = FIELD_BYTES[field]
    if (name.length !== to - from) return false
    const { bytes } = this
    for (let i = 0; i < name.length; i++) if (bytes[from + i] !== name[i]) return false
    return true
  }

  #findField(from: number, to: number): number {
    let bytes = this.bytes
    let [start, stop] = [from, to]
    if (this.#special) {
      bytes = new TextEncoder().encode(unescaped(this.bytes, from, to))
      start = 0
      stop = bytes.length
    }
    const candidates = BY_LENGTH[stop - start]
    if (candidates) {
      next: for (const { field, bytes: name } of candidates) {
        for (let i = 0; i < name.length; i++) if (bytes[start + i] !== name[i]) continue next
        return field
      }
    }
    return this.#isNewUnknown(from, to) ? UNKNOWN : DUPLICATE
  }

  /** Notes a name that the format does not know; false when it was there before. */
  #isNewUnknown(from: number, to: number): boolean {
    const { bytes } = this
    if (!this.#unknownNames && this.#special === 0 && this.#unknown < FEW) {
      for (let i = 0; i < this.#unknown; i++)
        if (isSame(bytes, this.#unknownFrom[i], this.#unknownTo[i], from, to)) return false
      this.#unknownFrom[this.#unknown] = from
      this.#unknownTo[this.#unknown++] = to
      return true
    }
    if (!this.#unknownNames) {
      this.#unknownNames = new Set()
      for (let i = 0; i < this.#unknown; i++)
        this.#unknownNames.add(decodeUtf8(bytes, this.#unknownFrom[i], this.#unknownTo[i]))
    }
    const { size } = this.#unknownNames
    return this.#unknownNames.add(unescaped(bytes, from, to)).size > size
  }

  /** Scans the value that begins with byte `c` and leaves its type, ABSENT on failure. */
  #value(c: number): number {
    if (c === 0x22) return this.#string() ? STRING : ABSENT
    if (c === 0x2d || (c >= 0x30 && c <= 0x39)) return this.#number() ? NUMBER : ABSENT
    if (c === 0x7b || c === 0x5b) return this.#nested() ? (c === 0x7b ? OBJECT : ARRAY) : ABSENT
    if (c === 0x74) return this.#word('true') ? TRUE : ABSENT
    if (c === 0x66) return this.#word('false') ? FALSE : ABSENT
    if (c === 0x6e) return this.#word('null') ? NULL : ABSENT
    this.#fail('not-json', this.#at, 'a JSON value')
    return ABSENT
  }

  #word(word: string): boolean {
    for (let i = 0; i < word.length; i++) {
      if (this.#at + i >= this.#end || this.bytes[this.#at + i] !== word.charCodeAt(i)) {
        return this.#fail('not-json', this.#at, 'a JSON value')
      }
    }
    this.#at += word.length
    return true
  }

  #string(): boolean {
    const bytes = this.bytes
    const end = this.#end
    const from = this.#at
    let at = from + 1
    this.#special = 0
    let beyondAscii = false
    for (; at < end; at++) {
      const c = bytes[at]
      if (c === 0x22) {
        this.#at = at + 1
        if (beyondAscii && !isUtf8(bytes, from + 1, at))
          return this.#fail('invalid-utf-8', from, 'valid UTF-8')
        return true
      }
      if (c === 0x5c) {
        this.#special = 1
        at++
        const e = bytes[at]
        if (at >= end || !isEscape(e)) return this.#fail('not-json', at - 1, 'an escape that JSON knows')
        if (e !== 0x75) continue
        for (let i = 1; i <= 4; i++) {
          if (at + i >= end || !isHex(bytes[at + i]))
            return this.#fail('not-json', at - 1, 'four hexadecimal digits after \\u')
        }
        at += 4
      } else if (c < 0x20) {
        return this.#fail('not-json', at, 'control characters to be escaped in a string')
      } else if (c >= 0x80) beyondAscii = true
    }
    return this.#fail('not-json', end, 'the end of the string')
  }

  #number(): boolean {
    const bytes = this.bytes
    const end = this.#end
    let at = this.#at
    if (bytes[at] === 0x2d) {
      this.#special = 1
      at++
    }
    const whole = at
    at = digitsEnd(bytes, at, end)
    if (at === whole) return this.#fail('not-json', at, 'a digit')
    // Nothing may follow a leading zero.
    if (bytes[whole] === 0x30) at = whole + 1
    if (at < end && bytes[at] === 0x2e) {
      this.#special = 1
      const fraction = ++at
      at = digitsEnd(bytes, at, end)
      if (at === fraction) return this.#fail('not-json', at, 'a digit after the point')
    }
    if (at < end && (bytes[at] === 0x65 || bytes[at] === 0x45)) {
      this.#special = 1
      at++
      if (at < end && (bytes[at] === 0x2b || bytes[at] === 0x2d)) at++
      const exponent = at
      at = digitsEnd(bytes, at, end)
      if (at === exponent) return this.#fail('not-json', at, 'a digit in the exponent')
    }
    this.#at = at
    return true
  }

  /** Checks and skips an object or array, with a stack of its own. */
  #nested(): boolean {
    const open = this.#containers
    let depth = 0
    let c = this.bytes[this.#at]
    for (;;) {
      // At the start of a value.
      if (c === 0x7b || c === 0x5b) {
        if (depth === DEPTH_LIMIT)
          return this.#fail('too-deep', this.#at, `at most ${DEPTH_LIMIT} levels of nesting`)
        open[depth++] = c
        this.#at++
        const first = this.#white()
        if (first !== c + 2) {
          if (c === 0x7b && !this.#name()) return false
          c = this.#white()
          continue
        }
        this.#at++
        depth--
      } else if (this.#value(c) === ABSENT) return false
      // After a value.
      for (;;) {
        if (depth === 0) return true
        const next = this.#white()
        this.#at++
        if (next === open[depth - 1] + 2) {
          depth--
          continue
        }
        if (next !== 0x2c) return this.#fail('not-json', this.#at - 1, 'a comma or the end of the value')
        break
      }
      if (open[depth - 1] === 0x7b && !this.#name()) return false
      c = this.#white()
    }
  }

  #name(): boolean {
    if (this.#white() !== 0x22) return this.#fail('not-json', this.#at, 'a member name in quotes')
    if (!this.#string()) return false
    if (this.#white() !== 0x3a) return this.#fail('not-json', this.#at, 'a colon')
    this.#at++
    return true
  }
}

function isSame(bytes: Uint8Array, aFrom: number, aTo: number, bFrom: number, bTo: number): boolean {
  if (aTo - aFrom !== bTo - bFrom) return false
  for (let a = aFrom, b = bFrom; a < aTo; a++, b++) if (bytes[a] !== bytes[b]) return false
  return true
}

const UNKNOWN = -1
const DUPLICATE = -2

/** Where the digits from `at` on end. */
function digitsEnd(bytes: Uint8Array, at: number, end: number): number {
  let to = at
  while (to < end && bytes[to] >= 0x30 && bytes[to] <= 0x39) to++
  return to
}

function isEscape(c: number): boolean {
  switch (c) {
    case 0x22: // "
    case 0x5c: // \
    case 0x2f: // /
    case 0x62: // b
    case 0x66: // f
    case 0x6e: // n
    case 0x72: // r
    case 0x74: // t
    case 0x75: // u
      return true
    default:
      return false
  }
}

function isHex(c: number): boolean {
  return (c >= 0x30 && c <= 0x39) || (c >= 0x41 && c <= 0x46) || (c >= 0x61 && c <= 0x66)
}

/** The text of checked string bytes, without their quotes. */
export function unescaped(bytes: Uint8Array, from: number, to: number): string {
  return JSON.parse(`"${decodeUtf8(bytes, from, to)}"`) as string
}
