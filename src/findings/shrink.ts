/**
 * Delta debugging on closed subsets (Zeller and Hildebrandt 2002): an operation goes together with what depends on
 * it, and what is left must still be broken.
 */

/** Which other operations must go when one goes. */
export type Dependents = (removed: number, among: ReadonlySet<number>) => Iterable<number>

/** Takes away what it can, in halves, quarters and so on, then one by one until nothing goes any more. */
export function shrink(
  operations: readonly number[],
  isBroken: (operations: ReadonlySet<number>) => boolean,
  dependents: Dependents,
  starting = -1,
): number[] {
  let kept = new Set(operations)
  const attempt = (removed: readonly number[]): boolean => {
    const rest = new Set(kept)
    const waiting = removed.filter((i) => i !== starting && rest.delete(i))
    if (waiting.length === 0) return false
    for (let i = waiting.pop(); i !== undefined; i = waiting.pop()) {
      for (const other of dependents(i, rest))
        if (other !== starting && rest.delete(other)) waiting.push(other)
    }
    if (rest.size === 0 || !isBroken(rest)) return false
    kept = rest
    return true
  }
  for (let size = kept.size >> 1; size > 1; size >>= 1) {
    const all = [...kept]
    for (let at = all.length; at > 0; at -= size) attempt(all.slice(Math.max(0, at - size), at))
  }
  for (let again = true; again; ) {
    again = false
    for (const i of [...kept].reverse()) if (kept.has(i) && attempt([i])) again = true
  }
  return [...kept].sort((a, b) => a - b)
}
