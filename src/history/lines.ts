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
  let carry = new Uint8Array(0)
  let line = 1
  let skipping = false
  let first = true
  for await (const chunk of source.chunks()) {
    onBytes?.(chunk.length)
    let bytes: Uint8Array = chunk
    if (carry.length > 0) {
      bytes = new Uint8Array(carry.length + chunk.length)
      bytes.set(carry)
      bytes.set(chunk, carry.length)
    }
    let from = 0
    if (first && bytes.length >= 3) {
      if (bytes[0] === 0xef && bytes[1] === 0xbb && bytes[2] === 0xbf) from = 3
      first = false
    } else if (first) {
      carry = bytes.slice()
      continue
    }
    for (let end = bytes.indexOf(0x0a, from); end >= 0; end = bytes.indexOf(0x0a, from)) {
      if (skipping) {
        skipping = false
      } else if (end - from > LINE_LIMIT) {
        if (!visitor.tooLong(line)) return
      } else if (!visitor.line(bytes, from, withoutReturn(bytes, from, end), line, true)) return
      line++
      from = end + 1
    }
    if (skipping) carry = new Uint8Array(0)
    else if (bytes.length - from > LINE_LIMIT) {
      skipping = true
      carry = new Uint8Array(0)
      if (!visitor.tooLong(line)) return
    } else carry = bytes.slice(from)
  }
  if (carry.length === 0) return
  const from = first && carry.length >= 3 && carry[0] === 0xef ? 3 : 0
  visitor.line(carry, from, withoutReturn(carry, from, carry.length), line, false)
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
