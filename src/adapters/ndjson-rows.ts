/**
 * Records of a log that has a JSON object a line.
 */
import { visitLines } from '../history/lines.js'
import type { ByteSource } from '../history/source.js'
import { decodeUtf8, isUtf8 } from '../history/utf8.js'
import { type JsonNode, JsonTrouble, parseJson } from './json-node.js'
import { type Field, lookUp, type Row, type RowVisitor } from './rows.js'
import { quoted } from './trouble.js'

/** Reads the records of a source. Blank lines are passed over; a torn last line is set aside with a warning. */
export async function readNdjson(source: ByteSource, visitor: RowVisitor): Promise<void> {
  const paused: ByteSource = {
    name: source.name,
    async *chunks() {
      for await (const chunk of source.chunks()) {
        yield chunk
        await visitor.pause()
      }
    },
  }
  await visitLines(paused, {
    line(bytes, from, to, line, terminated) {
      if (!isUtf8(bytes, from, to)) {
        return visitor.problem({
          code: 'invalid-utf-8',
          file: source.name,
          line,
          found: 'bytes that are no UTF-8',
          expected: 'text in UTF-8',
          advice: 'convert the file to UTF-8',
        })
      }
      const text = decodeUtf8(bytes, from, to)
      if (text.trim() === '') return true
      let node: JsonNode
      try {
        node = parseJson(text)
      } catch (error) {
        if (!(error instanceof JsonTrouble)) throw error
        if (!terminated) {
          visitor.warning(
            line,
            'the last line is cut short and has no line end, as after a crash: it is set aside',
          )
          return true
        }
        const found = text.slice(error.at, error.at + 24)
        return visitor.problem({
          code: 'not-json',
          file: source.name,
          line,
          column: Buffer.byteLength(text.slice(0, error.at)) + 1,
          found: found === '' ? 'the end of the line' : quoted(found),
          expected: error.expected,
        })
      }
      if (node.kind !== 'object') {
        return visitor.problem({
          code: 'not-an-object',
          file: source.name,
          line,
          found: quoted(text),
          expected: 'a JSON object a line',
        })
      }
      return visitor.row(new JsonRow(node, line))
    },
    tooLong: (line) =>
      visitor.problem({
        code: 'line-too-long',
        file: source.name,
        line,
        found: 'a line of over 16 MiB',
        expected: 'one record a line, of at most 16 MiB',
      }),
  })
}

class JsonRow implements Row {
  readonly line: number
  readonly #node: JsonNode

  constructor(node: JsonNode, line: number) {
    this.#node = node
    this.line = line
  }

  get(field: Field): JsonNode | undefined {
    return lookUp(this.#node, field)
  }

  isEmpty(): boolean {
    return false
  }

  all(): JsonNode {
    return this.#node
  }
}
