/**
 * UTF-8 with lone surrogates let through (JSON can escape them), so that every JSON string has bytes of its own.
 */
const decoder = new TextDecoder('utf-8', { ignoreBOM: true })
const strict = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true })
const encoder = new TextEncoder()

/** Whether the bytes are valid UTF-8 (no lone surrogates). */
export function isUtf8(bytes: Uint8Array, from: number, to: number): boolean {
  try {
    strict.decode(bytes.subarray(from, to))
    return true
  } catch {
    return false
  }
}

/** The string of bytes made by `encodeUtf8`, or of valid UTF-8. */
export function decodeUtf8(bytes: Uint8Array, from: number, to: number): string {
  for (let i = from; i < to - 2; i++) {
    if (bytes[i] === 0xed && bytes[i + 1] >= 0xa0) return decodeWithSurrogates(bytes, from, to)
  }
  return decoder.decode(bytes.subarray(from, to))
}

function decodeWithSurrogates(bytes: Uint8Array, from: number, to: number): string {
  let text = ''
  let plain = from
  for (let i = from; i < to - 2; i++) {
    if (bytes[i] !== 0xed || bytes[i + 1] < 0xa0) continue
    text += decoder.decode(bytes.subarray(plain, i))
    text += String.fromCharCode(0xd000 | ((bytes[i + 1] & 0x3f) << 6) | (bytes[i + 2] & 0x3f))
    i += 2
    plain = i + 1
  }
  return text + decoder.decode(bytes.subarray(plain, to))
}

/** The bytes of a string; a lone surrogate becomes the three bytes that its code point would take. */
export function encodeUtf8(text: string): Uint8Array {
  if (text.isWellFormed()) return encoder.encode(text)
  const parts: number[] = []
  for (const character of text) {
    const code = character.codePointAt(0)!
    if (code >= 0xd800 && code <= 0xdfff) parts.push(0xed, 0x80 | ((code >> 6) & 0x3f), 0x80 | (code & 0x3f))
    else parts.push(...encoder.encode(character))
  }
  return Uint8Array.from(parts)
}
