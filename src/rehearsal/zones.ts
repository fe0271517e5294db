/**
 * Decides, as a register is used, which answer first contradicts the earlier ones under true time: the zones of
 * Gibbons and Korach 1997. Two versions contradict each other when each had an operation that ended before one of
 * the other began: each would have to come before the other.
 */
import type { Operation, Version } from './operation.js'

/** So many versions are kept before those that cannot matter are dropped. */
const KEPT = 64

export class Zones {
  /** no request lasts longer, ns */
  readonly #longest: number
  /** versions that some ended operation wrote or returned, in no order */
  #versions: Version[]
  #room = KEPT
  /** versions that a cas has replaced */
  readonly #replaced = new WeakSet<Version>()

  constructor(initial: Version, longest: number) {
    initial.firstEnd = Number.NEGATIVE_INFINITY
    this.#versions = [initial]
    this.#longest = longest
  }

  /** An acknowledged operation ends: whether what it wrote or returned contradicts what was seen before. */
  ended({ kind, start, version }: Operation, found: Version, applied: boolean, now: number): boolean {
    let isWrong = false
    if (kind === 'read' || kind === 'cas') isWrong = this.#use(found, start, now)
    if (kind === 'cas' && applied) {
      if (this.#replaced.has(found)) isWrong = true
      this.#replaced.add(found)
    }
    if (kind !== 'read' && applied) isWrong = this.#use(version!, start, now) || isWrong
    return isWrong
  }

  #use(version: Version, start: number, now: number): boolean {
    if (!this.#versions.includes(version)) this.#versions.push(version)
    version.firstEnd = Math.min(version.firstEnd, now)
    version.lastStart = Math.max(version.lastStart, start)
    const isWrong = this.#versions.some(
      (other) =>
        other !== version && other.firstEnd < version.lastStart && version.firstEnd < other.lastStart,
    )
    if (this.#versions.length > this.#room) this.#thinOut(now)
    return isWrong
  }

  /**
   * Of the versions known before every request in flight began, the two last used show whatever the others could: one
   * of them at least is not the version that it is about.
   */
  #thinOut(now: number): void {
    const settled: Version[] = []
    const others: Version[] = []
    for (const version of this.#versions)
      (version.firstEnd < now - this.#longest ? settled : others).push(version)
    settled.sort((a, b) => b.lastStart - a.lastStart)
    this.#versions = others.concat(settled.slice(0, 2))
    this.#room = Math.max(KEPT, 2 * this.#versions.length)
  }
}
