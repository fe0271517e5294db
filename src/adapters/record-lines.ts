/**
 * On which line each record of a CSV file begins, told by the bytes at which records end: cells may hold line ends,
 * and blank lines and comments may stand between records.
 */
export class RecordLines {
  readonly #comment: string | undefined
  /** bytes from the end of the last record on */
  #bytes: Buffer = Buffer.alloc(0)
  /** offset in the file of the first of these bytes */
  #offset = 0
  /** 1-based line of the first of these bytes */
  #line = 1

  /** `comment` begins a line that is no record. */
  constructor(comment: string | undefined) {
    this.#comment = comment === undefined ? undefined : Buffer.from(comment).toString('latin1')
  }

  feed(chunk: Buffer): void {
    this.#bytes = this.#bytes.length === 0 ? chunk : Buffer.concat([this.#bytes, chunk])
  }

  /** The line of the record that ends at a byte of the file; it has to be fed, and records taken in order. */
  take(end: number): number {
    const length = end - this.#offset
    const text = this.#bytes.toString('latin1', 0, length)
    const line = this.#line + newlines(text.slice(0, this.#leading(text)))
    this.#bytes = this.#bytes.subarray(length)
    this.#offset = end
    this.#line += newlines(text)
    return line
  }

  /** The line of the record that has begun but not ended. */
  get open(): number {
    const text = this.#bytes.toString('latin1', 0, OPEN_LIMIT)
    return this.#line + newlines(text.slice(0, this.#leading(text)))
  }

  /** How many characters of blank lines and comments come first. */
  #leading(text: string): number {
    let at = 0
    for (;;) {
      while (text[at] === '\n' || text[at] === '\r') at++
      if (this.#comment === undefined || !text.startsWith(this.#comment, at)) return at
      while (at < text.length && text[at] !== '\n' && text[at] !== '\r') at++
      if (at === text.length) return at
    }
  }
}

/** So far the beginning of a record is looked for: comments before it may be long, but not that long. */
const OPEN_LIMIT = 1 << 20

function newlines(text: string): number {
  let count = 0
  for (let at = 0; at < text.length; at++) {
    const c = text.charCodeAt(at)
    if (c === 0x0a || (c === 0x0d && text.charCodeAt(at + 1) !== 0x0a)) count++
  }
  return count
}
