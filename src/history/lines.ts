/**
 * Cuts a stream of bytes into lines, and fetches single lines again for what is shown.
 */
import type { ByteSource } from './source.js'

/** Longest line that is read, in bytes. */
export const LINE_LIMIT = 16 * 1024 * 1024

/** One line of a chunk: bytes[from … to) without its end. */
export interface LineVisitor {
  /** `terminated`: a line end follows; false only for the last line of an input */
  line(bytes: Uint8Array, from: number, to: number, line: number, terminated: boolean): boolean
  /** a line over LINE_LIMIT; its bytes are skipped */
  tooLong(line: number): boolean
}

/** Visits the lines of a source in order until a visitor answers false. Skips a byte-order mark. */
export async function visitLines(
  source: ByteSource,
  visitor: LineVisitor,
  onBytes?: (n: number) => void,
): Promise<void> {
  const cutter = new LineCutter(visitor)
  for await (const chunk of source.chunks()) {
    onBytes?.(chunk.length)
    if (!cutter.add(chunk)) return
  }
  cutter.end()
}

/** Cuts chunks into lines; only a line that spans chunks is copied. */
class LineCutter {
  readonly #visitor: LineVisitor
  /** the beginning of a line whose end has not come */
  #carry: Uint8Array[] = []
  #carried = 0
  #line = 1
  /** inside a line that is too long */
  #skipping = false

  constructor(visitor: LineVisitor) {
    this.#visitor = visitor
  }

  /** False: the visitor has had enough. */
  add(chunk: Uint8Array): boolean {
    let from = 0
    for (let end = chunk.indexOf(0x0a); end >= 0; end = chunk.indexOf(0x0a, from)) {
      if (!this.#finish(chunk, from, end, true)) return false
      this.#line++
      from = end + 1
    }
    const rest = chunk.length - from
    if (this.#skipping || rest === 0) return true
    if (this.#carried + rest > LINE_LIMIT) {
      this.#skipping = true
      this.#carry = []
      this.#carried = 0
      return this.#visitor.tooLong(this.#line)
    }
    // A copy: a Buffer's own slice would be a view of bytes that are overwritten.
    this.#carry.push(new Uint8Array(chunk.subarray(from)))
    this.#carried += rest
    return true
  }

  end(): void {
    if (this.#carried > 0) this.#finish(new Uint8Array(0), 0, 0, false)
  }

  #finish(chunk: Uint8Array, from: number, end: number, terminated: boolean): boolean {
    if (this.#skipping) {
      this.#skipping = false
      return true
    }
    if (this.#carried + end - from > LINE_LIMIT) {
      this.#carry = []
      this.#carried = 0
      return this.#visitor.tooLong(this.#line)
    }
    if (this.#carried === 0) return this.#visit(chunk, from, end, terminated)
    const whole = new Uint8Array(this.#carried + end - from)
    let at = 0
    for (const part of this.#carry) {
      whole.set(part, at)
      at += part.length
    }
    whole.set(chunk.subarray(from, end), at)
    this.#carry = []
    this.#carried = 0
    return this.#visit(whole, 0, whole.length, terminated)
  }

  #visit(bytes: Uint8Array, from: number, end: number, terminated: boolean): boolean {
    const isMarked =
      this.#line === 1 && bytes[from] === 0xef && bytes[from + 1] === 0xbb && bytes[from + 2] === 0xbf
    const start = isMarked && end - from >= 3 ? from + 3 : from
    return this.#visitor.line(bytes, start, withoutReturn(bytes, start, end), this.#line, terminated)
  }
}

function withoutReturn(bytes: Uint8Array, from: number, to: number): number {
  return to > from && bytes[to - 1] === 0x0d ? to - 1 : to
}

/** A line of one of several sources. */
export interface LinePlace {
  /** index into the sources */
  readonly file: number
  /** 1-based */
  readonly line: number
}

/** The texts of the wanted lines, without line ends, in the order asked. One pass over each source concerned. */
export async function fetchLines(
  sources: readonly ByteSource[],
  wanted: readonly LinePlace[],
): Promise<string[]> {
  const decoder = new TextDecoder()
  const texts = new Map<string, string>()
  for (const [file, source] of sources.entries()) {
    const lines = new Set(wanted.filter((place) => place.file === file).map((place) => place.line))
    if (lines.size === 0) continue
    await visitLines(source, {
      line(bytes, from, to, line) {
        if (lines.delete(line)) texts.set(`${file}:${line}`, decoder.decode(bytes.subarray(from, to)))
        return lines.size > 0
      },
      tooLong: () => true,
    })
  }
  return wanted.map(({ file, line }) => {
    const text = texts.get(`${file}:${line}`)
    if (text === undefined)
      throw new Error(`${sources[file].name} changed while it was read: line ${line} is gone`)
    return text
  })
}
