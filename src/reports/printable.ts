/**
 * Text from an input made safe for a terminal: control characters, and those that turn the reading direction or
 * stay invisible, are shown as escapes; long texts are cut with their size said.
 */

const UNSAFE =
  // C0, delete, C1; soft hyphen; direction; zero width; line and paragraph separators; tags; lone surrogates
  /[\p{Cc}\u00ad\u061c\u180e\u200b\u200e\u200f\u2028-\u202e\u2060-\u206f\ufeff\ufff9-\ufffb\u{e0000}-\u{e007f}]|\p{Cs}/gu

const SHORT: Readonly<Record<string, string>> = { '\n': '\\n', '\r': '\\r', '\t': '\\t' }

/** The text with everything unsafe written as `\u` escapes. */
export function printable(text: string): string {
  return text.replace(UNSAFE, (c) => {
    const code = c.codePointAt(0)!.toString(16)
    return SHORT[c] ?? (code.length > 4 ? `\\u{${code}}` : `\\u${code.padStart(4, '0')}`)
  })
}

/** The printable text, cut after `limit` characters with its whole length said. */
export function cut(text: string, limit: number): string {
  if (text.length <= limit) return printable(text)
  const characters = [...text]
  if (characters.length <= limit) return printable(text)
  return `${printable(characters.slice(0, limit).join(''))}… (${thousands(characters.length)} characters)`
}

/** "412,388" */
export function thousands(n: number): string {
  return n.toString().replace(/\B(?=(\d{3})+$)/g, ',')
}

/** "1 key", "2,000 keys" */
export function counted(n: number, one: string, many = `${one}s`): string {
  return `${thousands(n)} ${n === 1 ? one : many}`
}
