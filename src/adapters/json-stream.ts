/**
 * JSON documents that may be larger than memory: walks objects and arrays as text arrives, and hands out single
 * values whole.
 *
 * Methods are generators: each yields when it needs more text, and goes on once `push` has brought it or `end` has
 * said that there is none.
 */
import { type JsonNode, JsonTrouble, parseJson } from './json-node.js'
import { quoted } from './trouble.js'

/** Yields while it waits for text; returns a T. */
export type Waiting<T> = Generator<undefined, T, void>

/** Thrown where the text is no JSON. */
export class StreamTrouble extends Error {
  /** 1-based */
  readonly line: number
  readonly found: string
  readonly expected: string
  /** the text ended too early */
  readonly isCut: boolean

  constructor(line: number, found: string, expected: string, isCut = false) {
    super(`found ${found}, expected ${expected}`)
    this.line = line
    this.found = found
    this.expected = expected
    this.isCut = isCut
  }
}

/** A value that is read whole has at most so many characters. */
const VALUE_LIMIT = 16 * 1024 * 1024

export class JsonStream {
  #text = ''
  #at = 0
  #line = 1
  #ended = false

  push(text: string): void {
    this.#text = this.#text.slice(this.#at) + text
    this.#at = 0
  }

  end(): void {
    this.#ended = true
  }

  /** 1-based line of the next character */
  get line(): number {
    return this.#line
  }

  /** The next character that is no white space; '' at the end. */
  *next(): Waiting<string> {
    for (;;) {
      for (; this.#at < this.#text.length; this.#at++) {
        const c = this.#text[this.#at]
        if (c === '\n') this.#line++
        else if (c !== ' ' && c !== '\t' && c !== '\r') return c
      }
      if (this.#ended) return ''
      yield
    }
  }

  /** Walks an object; `member` has to take the value of each. */
  *object(what: string, member: (name: string) => Waiting<void>): Waiting<void> {
    yield* this.#expect('{', `${what}, an object`)
    const names = new Set<string>()
    if ((yield* this.next()) === '}') this.#at++
    else {
      for (let c = ','; c === ','; c = yield* this.#separator('}')) {
        if ((yield* this.next()) !== '"') throw this.#trouble('a member name in quotes')
        const { line } = this
        const name = (yield* this.value()) as JsonNode & { kind: 'string' }
        if (names.has(name.text))
          throw new StreamTrouble(line, `the member ${quoted(name.text)} twice`, 'each member once')
        names.add(name.text)
        yield* this.#expect(':', 'a colon')
        yield* member(name.text)
      }
    }
  }

  /** Walks an array, or null for an empty one; `item` has to take each. */
  *array(what: string, item: () => Waiting<void>): Waiting<void> {
    if ((yield* this.next()) === 'n') {
      yield* this.value()
      return
    }
    yield* this.#expect('[', `${what}, an array`)
    if ((yield* this.next()) === ']') this.#at++
    else for (let c = ','; c === ','; c = yield* this.#separator(']')) yield* item()
  }

  /** A value, read whole. */
  *value(): Waiting<JsonNode> {
    yield* this.next()
    const { line } = this
    const text = yield* this.#valueText()
    try {
      return parseJson(text)
    } catch (error) {
      if (!(error instanceof JsonTrouble)) throw error
      const before = text.slice(0, error.at).split('\n').length - 1
      const found = text.slice(error.at, error.at + 24).split('\n')[0]
      throw new StreamTrouble(line + before, found === '' ? 'the end' : quoted(found), error.expected)
    }
  }

  /** The text of the value that begins here, to its matching end. */
  *#valueText(): Waiting<string> {
    const scan = new ValueEnd(this.#text[this.#at] ?? '')
    while (!scan.find(this.#text, this.#at)) {
      if (this.#ended) {
        if (scan.isWord) break
        throw this.#trouble('the end of the value')
      }
      this.#limit(scan.length)
      yield
    }
    this.#limit(scan.length)
    const text = this.#text.slice(this.#at, this.#at + scan.length)
    this.#at += scan.length
    for (let at = text.indexOf('\n'); at >= 0; at = text.indexOf('\n', at + 1)) this.#line++
    return text
  }

  #limit(length: number): void {
    if (length <= VALUE_LIMIT) return
    throw new StreamTrouble(
      this.#line,
      'a value of over 16 Mi characters',
      'values of at most so many: spans stand one by one in a document',
    )
  }

  *#expect(c: string, expected: string): Waiting<void> {
    if ((yield* this.next()) !== c) throw this.#trouble(expected)
    this.#at++
  }

  /** Takes a comma or the closing bracket. */
  *#separator(close: string): Waiting<string> {
    const c = yield* this.next()
    if (c !== ',' && c !== close) throw this.#trouble(`a comma or ${close}`)
    this.#at++
    return c
  }

  #trouble(expected: string): StreamTrouble {
    const isCut = this.#ended && (this.#at >= this.#text.length || expected === 'the end of the value')
    const found = this.#text.slice(this.#at, this.#at + 24).split('\n')[0]
    return new StreamTrouble(this.#line, isCut ? 'the end of the file' : quoted(found), expected, isCut)
  }
}

/** Finds where a value ends, across chunks. */
class ValueEnd {
  /** characters of the value seen so far */
  length = 0
  /** a number, true, false or null, which ends where something else begins */
  readonly isWord: boolean
  #depth = 0
  #inString = false

  constructor(first: string) {
    this.isWord = first !== '{' && first !== '[' && first !== '"'
  }

  /** Looks on in text that has the value at `from`. True: it ends at `length`. */
  find(text: string, from: number): boolean {
    const stop = this.isWord ? /[\s,\]}]/g : /["\\[\]{}]/g
    stop.lastIndex = from + this.length
    for (let match = stop.exec(text); match; match = stop.exec(text)) {
      const [c] = match
      if (this.isWord) {
        this.length = match.index - from
        return true
      }
      if (this.#inString) {
        if (c === '\\') {
          // The escaped character may be in the next chunk.
          if (match.index + 1 >= text.length) {
            this.length = match.index - from
            return false
          }
          stop.lastIndex++
        } else if (c === '"') this.#inString = false
      } else if (c === '"') this.#inString = true
      else if (c === '{' || c === '[') this.#depth++
      else if (c === '}' || c === ']') this.#depth--
      if (!this.#inString && this.#depth === 0) {
        this.length = match.index + 1 - from
        return true
      }
    }
    this.length = text.length - from
    return false
  }
}
