/**
 * The text of a source, chunk by chunk, for formats that are not read line by line.
 */
import { InputError } from '../history/problems.js'
import type { ByteSource } from '../history/source.js'

/**
 * Decodes UTF-8 strictly and skips a byte-order mark. Throws InputError with the line of the first byte that is
 * none, or of a NUL byte.
 */
export async function* textChunks(source: ByteSource): AsyncGenerator<string> {
  const decoder = new TextDecoder('utf-8', { fatal: true })
  let line = 1
  const decode = (chunk: Uint8Array, stream: boolean): string => {
    try {
      return decoder.decode(chunk, { stream })
    } catch {
      throw notText(
        source.name,
        line + newlines(chunk.subarray(0, validPrefix(chunk))),
        'bytes that are no UTF-8',
      )
    }
  }
  for await (const chunk of source.chunks()) {
    const nul = chunk.indexOf(0)
    if (nul >= 0) throw notText(source.name, line + newlines(chunk.subarray(0, nul)), 'a NUL byte')
    const text = decode(chunk, true)
    line += newlines(chunk)
    if (text !== '') yield text
  }
  decode(new Uint8Array(0), false)
}

function notText(file: string, line: number, found: string): InputError {
  return new InputError([
    {
      code: found === 'a NUL byte' ? 'nul-byte' : 'invalid-utf-8',
      file,
      line,
      found,
      expected: 'text in UTF-8',
      advice: 'convert the file to UTF-8',
    },
  ])
}

function newlines(bytes: Uint8Array): number {
  let count = 0
  for (let at = bytes.indexOf(0x0a); at >= 0; at = bytes.indexOf(0x0a, at + 1)) count++
  return count
}

/** About how many bytes from the front are UTF-8: to the line, which is all that a message tells. */
function validPrefix(bytes: Uint8Array): number {
  const lossy = new TextDecoder().decode(bytes)
  const bad = lossy.indexOf('\ufffd')
  return bad < 0 ? bytes.length : Buffer.byteLength(lossy.slice(0, bad))
}
