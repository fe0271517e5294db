/**
 * Torn rows (findings.md): an object that nobody wrote, each of whose members equals that member of some
 * unrefused write or of the initial value, not all of one.
 */
import { NO_VALUE, type Values } from '../../history/columns.js'
import { objectMembers } from '../../history/object-members.js'
import type { KeyHistory } from '../../order/key-history.js'
import { isWrite } from '../../order/roles.js'

/** Which writes a torn row was put together from; -1 stands for the initial value. Local indices, few as can be. */
export class TornRows {
  readonly #values: Values
  /** member name and text → local writes with that member, in local order */
  readonly #writesOf = new Map<string, number[]>()

  constructor(key: KeyHistory, values: Values) {
    this.#values = values
    if (key.initial !== NO_VALUE) this.#add(-1, key.initial)
    for (let p = 0; p < key.n; p++) if (isWrite(key, p)) this.#add(p, key.value[p])
  }

  #add(write: number, value: number): void {
    for (const member of membersOf(this.#values.text(value))) {
      const writes = this.#writesOf.get(member)
      if (writes) writes.push(write)
      else this.#writesOf.set(member, [write])
    }
  }

  /** The sources of a value that nobody wrote, or undefined when it is not a torn row. */
  sources(value: number): number[] | undefined {
    const members = membersOf(this.#values.text(value))
    if (members.length === 0) return undefined
    const missing = new Set(members)
    for (const member of members) if (!this.#writesOf.has(member)) return undefined
    const sources: number[] = []
    while (missing.size > 0) {
      // Greedy cover: the write that has most of what is still missing.
      const tally = new Map<number, number>()
      for (const member of missing) {
        for (const write of this.#writesOf.get(member)!) tally.set(write, (tally.get(write) ?? 0) + 1)
      }
      let best = -2
      for (const [write, n] of tally) if (best === -2 || n > tally.get(best)!) best = write
      sources.push(best)
      for (const member of [...missing])
        if (this.#writesOf.get(member)!.includes(best)) missing.delete(member)
    }
    return sources.length > 1 ? sources.sort((a, b) => a - b) : undefined
  }
}

function membersOf(text: string): string[] {
  const members = objectMembers(text)
  return members ? members.map(({ name, value }) => `${name}:${value}`) : []
}
