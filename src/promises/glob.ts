/**
 * Key globs: `*` does not cross `/`, `**` does, dots are nothing special, the whole key, case counts.
 */

/** A test for keys. Linear in the key's length times the glob's; never backtracks into more. */
export function keyGlob(glob: string): (key: string) => boolean {
  if (glob === '**') return () => true
  const parts = parse(glob)
  return (key) => matches(parts, key)
}

/** A literal character, any one but `/` (`?`), any run without `/` (`*`), any run (`**`). */
type Part = { readonly literal: string } | 'one' | 'run' | 'anything'

function parse(glob: string): Part[] {
  const parts: Part[] = []
  for (let i = 0; i < glob.length; i++) {
    const c = glob[i]
    if (c === '\\' && i + 1 < glob.length) parts.push({ literal: glob[++i] })
    else if (c === '?') parts.push('one')
    else if (c === '*') {
      if (glob[i + 1] !== '*') {
        parts.push('run')
        continue
      }
      while (glob[i + 1] === '*') i++
      parts.push('anything')
    } else parts.push({ literal: c })
  }
  return parts
}

/** Simulates the automaton of the parts: the set of places that a prefix of the key can have led to. */
function matches(parts: readonly Part[], key: string): boolean {
  let places = new Uint8Array(parts.length + 1)
  places[0] = 1
  skipRuns(parts, places)
  for (const c of key.split('')) {
    const next = new Uint8Array(parts.length + 1)
    let any = false
    for (let at = 0; at < parts.length; at++) {
      if (places[at] === 0) continue
      const part = parts[at]
      if (part === 'anything' || (part === 'run' && c !== '/')) next[at] = 1
      else if (part === 'one' ? c !== '/' : typeof part === 'object' && part.literal === c) next[at + 1] = 1
      else continue
      any = true
    }
    if (!any) return false
    skipRuns(parts, next)
    places = next
  }
  return places[parts.length] === 1
}

/** A run may be empty. */
function skipRuns(parts: readonly Part[], places: Uint8Array): void {
  for (let at = 0; at < parts.length; at++) {
    if (places[at] === 1 && (parts[at] === 'run' || parts[at] === 'anything')) places[at + 1] = 1
  }
}
