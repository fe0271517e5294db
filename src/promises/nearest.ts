import leven from 'leven'

/** The name most like a mistyped one, or undefined when none is near. */
export function nearest(typed: string, names: Iterable<string>): string | undefined {
  let best: string | undefined
  let least = Math.max(2, Math.floor(typed.length / 2)) + 1
  for (const name of names) {
    if (Math.abs(name.length - typed.length) >= least) continue
    const distance = leven(typed.toLowerCase(), name.toLowerCase())
    if (distance < least) {
      best = name
      least = distance
    }
  }
  return best
}

/** `; did you mean …?` where a name is near, else nothing. */
export function didYouMean(typed: string, names: Iterable<string>): string {
  const name = nearest(typed, names)
  return name === undefined ? '' : `; did you mean ${name}?`
}
