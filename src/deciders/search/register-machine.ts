/**
 * The copy of a register key. A state is the value id it holds or, where a read may come too early or too late for a
 * write of its value, the write that put it there.
 */
import { CAS, DELETE, NO_VALUE, NULL_VALUE, WRITE } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import type { KeyHistory } from '../../order/key-history.js'
import { precedes } from '../../order/precedence.js'
import { isRead, isWrite, readValue } from '../../order/roles.js'
import { writesBetween } from '../version-bound.js'
import { IMPOSSIBLE, type Machine } from './machine.js'

/** A start that no read tells anything of. */
const NOBODY_KNOWS = -2

export class RegisterMachine implements Machine {
  readonly initial: readonly number[]
  readonly #counting: Counting
  readonly #key: KeyHistory
  /** true: a state is a value id; false: it is the local index of the last write, -1 - i for the initial value i */
  readonly #byValue: boolean
  readonly #starts: readonly number[]
  /** write → read → what `#maySee` said */
  readonly #seen = new Map<number, Map<number, boolean>>()

  constructor(counting: Counting) {
    this.#counting = counting
    this.#key = counting.key
    // Where every pair counts, a read that precedes a write is placed before it, and no read is a version behind.
    this.#byValue = counting.rule.readWrite === 'all' && counting.rule.writeRead === 'all'
    this.#starts = startsOf(counting.key)
    this.initial = this.#byValue ? this.#starts : this.#starts.map((_, i) => -1 - i)
  }

  after(state: number, p: number): number {
    const key = this.#key
    if (key.kind[p] === CAS) {
      if (this.#valueOf(state) !== key.extra[p]) return IMPOSSIBLE
      if (!this.#byValue && isRead(key, p) && !this.#maySee(state, p)) return IMPOSSIBLE
    }
    return this.#byValue ? key.value[p] : p
  }

  read(state: number, p: number): number {
    const key = this.#key
    const value = this.#valueOf(state)
    const wanted = readValue(key, p)
    // A failed cas that does not say what it saw only says what it did not see.
    if (wanted === NO_VALUE) return value === key.extra[p] ? IMPOSSIBLE : state
    if (value !== wanted || (!this.#byValue && !this.#maySee(state, p))) return IMPOSSIBLE
    return state
  }

  isBlind(p: number): boolean {
    return this.#key.kind[p] === WRITE || this.#key.kind[p] === DELETE
  }

  #valueOf(state: number): number {
    if (this.#byValue) return state
    return state < 0 ? this.#starts[-1 - state] : this.#key.value[state]
  }

  /** A read does not precede the write that it saw, and is at most so many versions behind. */
  #maySee(state: number, p: number): boolean {
    const writer = state < 0 ? -1 : state
    const answers = this.#seen.get(writer) ?? new Map<number, boolean>()
    this.#seen.set(writer, answers)
    const known = answers.get(p)
    if (known !== undefined) return known
    const answer = maySee(this.#counting, writer, p)
    answers.set(p, answer)
    return answer
  }
}

/** Whether local read `p` may have seen local write `writer` (-1: the initial value), by these two alone. */
export function maySee(counting: Counting, writer: number, p: number): boolean {
  const { key, rule } = counting
  if (writer >= 0 && precedes(key, p, writer)) return false
  return (
    rule.versions === undefined ||
    writesBetween(counting, writer, p, rule.versions + 1).length <= rule.versions
  )
}

/** The value ids that the key may have started with. */
function startsOf(key: KeyHistory): number[] {
  if (key.initial !== NO_VALUE) return [key.initial]
  const written = new Set<number>(key.offered)
  for (let p = 0; p < key.n; p++) if (isWrite(key, p)) written.add(key.value[p])
  // A value that was found and that nobody wrote, absence (deletes may write it too), or one that plays no part.
  const starts = new Set<number>()
  const found = (value: number): void => {
    if (value !== NO_VALUE && !written.has(value)) starts.add(value)
  }
  for (let p = 0; p < key.n; p++) {
    if (isRead(key, p)) found(readValue(key, p))
    else if (key.kind[p] === CAS && key.acked[p] === 0) found(key.extra[p])
  }
  starts.add(NULL_VALUE)
  return [...starts, NOBODY_KNOWS]
}
