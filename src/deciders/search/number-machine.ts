/**
 * The copy of a key with increments: a whole number to add to, absence counting as 0, or another value that nothing
 * can be added to. An unknown start is carried as "so much more than the start" until an answer tells it.
 */
import { CAS, DELETE, INCREMENT, NO_VALUE, NULL_VALUE, type Values, WRITE } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import { precedes } from '../../order/precedence.js'
import { isRead, isWrite, readValue } from '../../order/roles.js'
import { IMPOSSIBLE, type Machine } from './machine.js'

type Cell =
  | { readonly type: 'number'; readonly count: bigint }
  /** value id of what is no whole number; -2: a start that nobody knows and that is none */
  | { readonly type: 'other'; readonly value: number }
  /** the unknown start and `count`; `not`: counts that it cannot have started at */
  | { readonly type: 'start'; readonly count: bigint; readonly not: readonly bigint[] }

interface State {
  readonly cell: Cell
  /** the write that it goes back to and the increments since, where a read may come too early for one of them */
  readonly came: readonly number[]
}

export class NumberMachine implements Machine {
  readonly initial: readonly number[]
  readonly #counting: Counting
  readonly #values: Values
  /** false: a read that precedes an increment or write is always placed before it anyway */
  readonly #remembers: boolean
  readonly #states: State[] = []
  readonly #ids = new Map<string, number>()
  readonly #after: Map<number, number>[] = []
  readonly #read: Map<number, number>[] = []

  constructor(counting: Counting, values: Values) {
    this.#counting = counting
    this.#values = values
    const { key, rule } = counting
    this.#remembers = key.hasWrites && rule.readWrite !== 'all'
    this.initial = this.#starts().map((cell) => this.#idOf({ cell, came: [] }))
  }

  after(state: number, p: number): number {
    return remembered(this.#after[state], p, () => this.#work(this.#states[state], p))
  }

  read(state: number, p: number): number {
    return remembered(this.#read[state], p, () => {
      const { key } = this.#counting
      const { cell, came } = this.#states[state]
      const wanted = readValue(key, p)
      if (wanted === NO_VALUE) {
        const cells = this.#without(cell, this.#cellOf(key.extra[p]))
        return cells ? this.#idOf({ cell: cells, came }) : IMPOSSIBLE
      }
      const found = this.#meet(cell, this.#cellOf(wanted))
      return found && this.#isInTime(p, came) ? this.#idOf({ cell: found, came }) : IMPOSSIBLE
    })
  }

  isBlind(p: number): boolean {
    const kind = this.#counting.key.kind[p]
    return kind === WRITE || kind === DELETE
  }

  #work({ cell, came }: State, p: number): number {
    const { key } = this.#counting
    if (key.kind[p] === INCREMENT) {
      const by = this.#values.integer(key.extra[p])!
      if (cell.type === 'other') return IMPOSSIBLE
      let next: Cell = { ...cell, count: cell.count + by }
      if (isRead(key, p)) {
        const told = this.#meet(next, this.#cellOf(key.value[p]))
        if (!told || !this.#isInTime(p, came)) return IMPOSSIBLE
        next = told
      }
      return this.#idOf({ cell: next, came: this.#remembers ? [...came, p].sort((a, b) => a - b) : [] })
    }
    if (key.kind[p] === CAS) {
      if (!this.#meet(cell, this.#cellOf(key.extra[p]))) return IMPOSSIBLE
      if (isRead(key, p) && !this.#isInTime(p, came)) return IMPOSSIBLE
    }
    return this.#idOf({ cell: this.#cellOf(key.value[p]), came: this.#remembers ? [p] : [] })
  }

  /** A read precedes neither the last write before it nor any increment since. */
  #isInTime(read: number, came: readonly number[]): boolean {
    return !came.some((p) => precedes(this.#counting.key, read, p))
  }

  /** What the cell is when it is known to be `told`, or undefined when it cannot be. */
  #meet(cell: Cell, told: Cell): Cell | undefined {
    if (cell.type === 'start')
      return told.type === 'number' && !cell.not.includes(told.count - cell.count) ? told : undefined
    if (cell.type === 'number') return told.type === 'number' && told.count === cell.count ? cell : undefined
    return told.type === 'other' && told.value === cell.value ? cell : undefined
  }

  /** What the cell is when it is known not to be `other`, or undefined when it is. */
  #without(cell: Cell, other: Cell): Cell | undefined {
    if (cell.type !== 'start') return this.#meet(cell, other) ? undefined : cell
    if (other.type !== 'number') return cell
    const start = other.count - cell.count
    if (cell.not.includes(start)) return cell
    return { ...cell, not: [...cell.not, start].sort((a, b) => (a < b ? -1 : 1)) }
  }

  #cellOf(value: number): Cell {
    if (value === NULL_VALUE) return { type: 'number', count: 0n }
    const count = this.#values.integer(value)
    return count === undefined ? { type: 'other', value } : { type: 'number', count }
  }

  #starts(): Cell[] {
    const { key } = this.#counting
    if (key.initial !== NO_VALUE) return [this.#cellOf(key.initial)]
    const starts: Cell[] = [{ type: 'start', count: 0n, not: [] }]
    if (!key.hasWrites) return starts
    const others = new Set<number>([-2])
    const found = (value: number): void => {
      if (value !== NO_VALUE && this.#cellOf(value).type === 'other') others.add(value)
    }
    for (let p = 0; p < key.n; p++) {
      if (isRead(key, p)) found(readValue(key, p))
      if (key.kind[p] === CAS) found(key.extra[p])
      if (isWrite(key, p)) found(key.value[p])
    }
    for (const value of others) starts.push({ type: 'other', value })
    return starts
  }

  #idOf(state: State): number {
    const { cell, came } = state
    const name = `${cell.type} ${cell.type === 'other' ? cell.value : cell.count} ${cell.type === 'start' ? cell.not : ''} ${came}`
    let id = this.#ids.get(name)
    if (id === undefined) {
      id = this.#states.length
      this.#ids.set(name, id)
      this.#states.push(state)
      this.#after.push(new Map())
      this.#read.push(new Map())
    }
    return id
  }
}

function remembered(answers: Map<number, number>, p: number, work: () => number): number {
  const known = answers.get(p)
  if (known !== undefined) return known
  const answer = work()
  answers.set(p, answer)
  return answer
}
