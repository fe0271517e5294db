/**
 * Splits the canonical text of a JSON object into its members, without turning numbers into doubles.
 */
export interface Member {
  /** the name as it stands in the text, with quotes */
  readonly name: string
  /** the value's canonical text */
  readonly value: string
}

/** The members of canonical JSON text, in its order, or undefined when it is not an object. O(length). */
export function objectMembers(text: string): Member[] | undefined {
  if (text[0] !== '{') return undefined
  const members: Member[] = []
  let at = 1
  while (text[at] !== '}') {
    if (text[at] === ',') at++
    const nameEnd = endOfValue(text, at)
    const valueEnd = endOfValue(text, nameEnd + 1)
    members.push({ name: text.slice(at, nameEnd), value: text.slice(nameEnd + 1, valueEnd) })
    at = valueEnd
  }
  return members
}

/** Where the value that starts at `from` ends. */
function endOfValue(text: string, from: number): number {
  let depth = 0
  let inString = false
  for (let i = from; i < text.length; i++) {
    const c = text[i]
    if (inString) {
      if (c === '\\') i++
      else if (c === '"') {
        inString = false
        if (depth === 0) return i + 1
      }
    } else if (c === '"') inString = true
    else if (c === '{' || c === '[') depth++
    else if (c === '}' || c === ']') {
      if (depth === 0) return i
      if (--depth === 0) return i + 1
    } else if ((c === ',' || c === ':') && depth === 0) return i
  }
  return text.length
}
