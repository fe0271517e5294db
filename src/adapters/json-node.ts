/**
 * JSON read strictly by RFC 8259 into nodes that keep each number's own digits, so that none passes through a
 * double; and written back.
 */

/** A JSON value. A number's `text` is as it stands in the source. */
export type JsonNode =
  | { readonly kind: 'string'; readonly text: string }
  | { readonly kind: 'number'; readonly text: string }
  | { readonly kind: 'boolean'; readonly text: 'true' | 'false' }
  | { readonly kind: 'null' }
  | { readonly kind: 'array'; readonly items: readonly JsonNode[] }
  | { readonly kind: 'object'; readonly members: ReadonlyMap<string, JsonNode> }

export const NULL: JsonNode = { kind: 'null' }
export const TRUE: JsonNode = { kind: 'boolean', text: 'true' }
export const FALSE: JsonNode = { kind: 'boolean', text: 'false' }

export function stringNode(text: string): JsonNode {
  return { kind: 'string', text }
}

/** Thrown for a text that is not JSON. */
export class JsonTrouble extends Error {
  /** index of the character where reading failed */
  readonly at: number
  readonly expected: string

  constructor(at: number, expected: string) {
    super(`expected ${expected}`)
    this.at = at
    this.expected = expected
  }
}

/** Deepest nesting that is read; readers of histories take 512 levels, of which the record itself is one. */
const DEPTH_LIMIT = 500

/** The value of a text. Throws JsonTrouble: not JSON, a member named twice, nested too deep. */
export function parseJson(text: string): JsonNode {
  const parser = new Parser(text)
  const node = parser.value(0)
  parser.finish()
  return node
}

/** One line of JSON text; numbers with the digits that were read. */
export function jsonText(node: JsonNode): string {
  switch (node.kind) {
    case 'string':
      return JSON.stringify(node.text)
    case 'number':
    case 'boolean':
      return node.text
    case 'null':
      return 'null'
    case 'array':
      return `[${node.items.map(jsonText).join(',')}]`
    case 'object':
      return `{${Array.from(node.members, ([name, value]) => `${JSON.stringify(name)}:${jsonText(value)}`).join(',')}}`
  }
}

/** What a string, number or boolean reads as; undefined for null, arrays and objects. */
export function scalarText(node: JsonNode): string | undefined {
  return 'text' in node ? node.text : undefined
}

const NUMBER = /-?(?:0|[1-9][0-9]*)(?:\.[0-9]+)?(?:[eE][+-]?[0-9]+)?/y
/** Characters of a string that need no second look: no control characters, quotes and backslashes. */
const PLAIN = /[ !#-[\]-\uffff]*/y
const ESCAPES: Record<string, string> = {
  '"': '"',
  '\\': '\\',
  '/': '/',
  b: '\b',
  f: '\f',
  n: '\n',
  r: '\r',
  t: '\t',
}

class Parser {
  readonly #text: string
  #at = 0

  constructor(text: string) {
    this.#text = text
  }

  finish(): void {
    if (this.#next() !== '') throw new JsonTrouble(this.#at, 'the end after the value')
  }

  value(depth: number): JsonNode {
    const c = this.#next()
    if (c === '"') return { kind: 'string', text: this.#string() }
    if (c === '{') return this.#object(depth)
    if (c === '[') return this.#array(depth)
    if (c === 't') return this.#word('true', TRUE)
    if (c === 'f') return this.#word('false', FALSE)
    if (c === 'n') return this.#word('null', NULL)
    NUMBER.lastIndex = this.#at
    const match = NUMBER.exec(this.#text)
    if (!match) throw new JsonTrouble(this.#at, 'a JSON value')
    this.#at += match[0].length
    return { kind: 'number', text: match[0] }
  }

  /** The next character that is no white space, '' at the end. */
  #next(): string {
    for (; this.#at < this.#text.length; this.#at++) {
      const c = this.#text[this.#at]
      if (c !== ' ' && c !== '\t' && c !== '\n' && c !== '\r') return c
    }
    return ''
  }

  #word(word: string, node: JsonNode): JsonNode {
    if (!this.#text.startsWith(word, this.#at)) throw new JsonTrouble(this.#at, 'a JSON value')
    this.#at += word.length
    return node
  }

  #object(depth: number): JsonNode {
    this.#deeper(depth)
    const members = new Map<string, JsonNode>()
    this.#at++
    if (this.#next() === '}') this.#at++
    else {
      for (let c = ','; c === ','; ) {
        if (this.#next() !== '"') throw new JsonTrouble(this.#at, 'a member name in quotes')
        const from = this.#at
        const name = this.#string()
        if (members.has(name)) throw new JsonTrouble(from, 'each member once')
        if (this.#next() !== ':') throw new JsonTrouble(this.#at, 'a colon')
        this.#at++
        members.set(name, this.value(depth + 1))
        c = this.#next()
        if (c !== ',' && c !== '}') throw new JsonTrouble(this.#at, 'a comma or the end of the object')
        this.#at++
      }
    }
    return { kind: 'object', members }
  }

  #array(depth: number): JsonNode {
    this.#deeper(depth)
    const items: JsonNode[] = []
    this.#at++
    if (this.#next() === ']') this.#at++
    else {
      for (let c = ','; c === ','; ) {
        items.push(this.value(depth + 1))
        c = this.#next()
        if (c !== ',' && c !== ']') throw new JsonTrouble(this.#at, 'a comma or the end of the array')
        this.#at++
      }
    }
    return { kind: 'array', items }
  }

  #deeper(depth: number): void {
    if (depth === DEPTH_LIMIT) throw new JsonTrouble(this.#at, `at most ${DEPTH_LIMIT} levels of nesting`)
  }

  #string(): string {
    this.#at++
    let text = ''
    for (;;) {
      PLAIN.lastIndex = this.#at
      text += PLAIN.exec(this.#text)![0]
      this.#at = PLAIN.lastIndex
      const c = this.#text[this.#at]
      if (c === undefined) throw new JsonTrouble(this.#at, 'the end of the string')
      if (c !== '"' && c !== '\\')
        throw new JsonTrouble(this.#at, 'control characters to be escaped in a string')
      this.#at++
      if (c === '"') return text
      text += this.#escape()
    }
  }

  #escape(): string {
    const c = this.#text[this.#at]
    this.#at++
    if (c === 'u') {
      const digits = this.#text.slice(this.#at, this.#at + 4)
      if (!/^[0-9a-fA-F]{4}$/.test(digits))
        throw new JsonTrouble(this.#at, 'four hexadecimal digits after \\u')
      this.#at += 4
      return String.fromCharCode(Number.parseInt(digits, 16))
    }
    const plain = ESCAPES[c]
    if (plain === undefined) throw new JsonTrouble(this.#at - 1, 'an escape that JSON knows')
    return plain
  }
}
