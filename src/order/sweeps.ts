/**
 * For every operation the extreme of a number over the operations that count as before, or as after it, without
 * listing pairs: sweeps over the clocks of precedence. Each sweep takes O(n log n) for the whole key.
 */
import type { Scope } from '../promises/promise.js'
import type { Counting } from './counting.js'
import { sortedPositions } from './sorting.js'

/** Operations of one clock in the order in which a sweep passes them, and the extreme of those passed. */
interface Run {
  readonly members: readonly number[]
  next: number
  extreme: number
}

/** The operations of one clock each: all by certain ends, those of a host, those of a client. */
class Clocks {
  readonly all: Run
  readonly #hosts = new Map<number, Run>()
  readonly #clients = new Map<number, Run>()
  readonly #counting: Counting

  constructor(counting: Counting, order: Int32Array, identity: number) {
    this.#counting = counting
    const { client, host } = counting.key
    const add = (runs: Map<number, Run>, clock: number, p: number): void => {
      const run = runs.get(clock)
      if (run) (run.members as number[]).push(p)
      else runs.set(clock, { members: [p], next: 0, extreme: identity })
    }
    for (const p of order) {
      add(this.#hosts, host[p], p)
      add(this.#clients, client[p], p)
    }
    this.all = { members: Array.from(order), next: 0, extreme: identity }
  }

  host(p: number): Run {
    return this.#hosts.get(this.#counting.key.host[p])!
  }

  client(p: number): Run {
    return this.#clients.get(this.#counting.key.client[p])!
  }
}

/** The ends that a scope compares with starts. */
function endsOf(counting: Counting, scope: Scope): { sure: Float64Array; own: Float64Array } {
  if (scope === 'late') return { sure: counting.delays!.sureEnd, own: counting.delays!.end }
  return { sure: counting.key.sureEnd, own: counting.key.end }
}

/**
 * The greatest `level` among the acked operations that count as before an operation. `level` may still change
 * for an operation until the sweep has passed it; -Infinity means that it takes no part.
 */
export class GreatestBefore {
  readonly #counting: Counting
  readonly #scope: Scope
  readonly #level: Float64Array
  readonly #sure: Float64Array
  readonly #own: Float64Array
  readonly #byEnd: Clocks
  readonly #sessions: Clocks

  constructor(counting: Counting, scope: Scope, level: Float64Array) {
    this.#counting = counting
    this.#scope = scope
    this.#level = level
    const { sure, own } = endsOf(counting, scope)
    this.#sure = sure
    this.#own = own
    this.#byEnd = new Clocks(counting, sortedPositions(own), Number.NEGATIVE_INFINITY)
    this.#sessions = new Clocks(counting, Int32Array.from(own.keys()), Number.NEGATIVE_INFINITY)
  }

  /** The greatest level before local operation `b`. Ask in rising order of `b`. */
  at(b: number): number {
    const scope = this.#scope
    const { key, closing } = this.#counting
    if (scope === 'none' || (scope === 'closing' && closing![b] === 0)) return Number.NEGATIVE_INFINITY
    const inSession = (a: number): boolean => a < b
    if (scope === 'session') return this.#pass(this.#sessions.client(b), inSession)
    const start = key.start[b]
    const isOver = (a: number): boolean => this.#own[a] < start
    return Math.max(
      this.#pass(this.#byEnd.all, (a) => this.#sure[a] < start),
      this.#pass(this.#byEnd.host(b), isOver),
      scope === 'late'
        ? this.#pass(this.#byEnd.client(b), isOver)
        : this.#pass(this.#sessions.client(b), inSession),
    )
  }

  #pass(run: Run, isBefore: (a: number) => boolean): number {
    const { members } = run
    while (run.next < members.length && isBefore(members[run.next])) {
      const a = members[run.next++]
      if (this.#counting.key.acked[a] === 1 && this.#level[a] > run.extreme) run.extreme = this.#level[a]
    }
    return run.extreme
  }
}

/**
 * The least `level` among the operations that count as after an acked one. `level` may still change for an
 * operation until the sweep has passed it; Infinity means that it takes no part.
 */
export class LeastAfter {
  /** the order in which to ask: a linear extension of precedence, backward */
  readonly order: Int32Array
  readonly #counting: Counting
  readonly #scope: Scope
  readonly #level: Float64Array
  readonly #sure: Float64Array
  readonly #own: Float64Array
  readonly #byStart: Clocks
  readonly #sessions: Clocks
  /** local index → place in `order` */
  readonly #placeOf: Int32Array

  constructor(counting: Counting, scope: Scope, level: Float64Array) {
    this.#counting = counting
    this.#scope = scope
    this.#level = level
    const { sure, own } = endsOf(counting, scope)
    this.#sure = sure
    this.#own = own
    const { key } = counting
    this.order = sortedPositions(key.end).reverse()
    this.#placeOf = new Int32Array(key.n)
    this.order.forEach((p, place) => {
      this.#placeOf[p] = place
    })
    this.#byStart = new Clocks(counting, sortedPositions(key.start).reverse(), Number.POSITIVE_INFINITY)
    this.#sessions = new Clocks(counting, this.order, Number.POSITIVE_INFINITY)
  }

  /** The least level after local operation `a`. Ask in the order of `order`. */
  at(a: number): number {
    const scope = this.#scope
    const { key } = this.#counting
    if (scope === 'none' || key.acked[a] === 0) return Number.POSITIVE_INFINITY
    const inSession = (b: number): boolean => this.#placeOf[b] < this.#placeOf[a]
    if (scope === 'session') return this.#pass(this.#sessions.client(a), inSession)
    const isLater = (b: number): boolean => key.start[b] > this.#own[a]
    return Math.min(
      this.#pass(this.#byStart.all, (b) => key.start[b] > this.#sure[a]),
      this.#pass(this.#byStart.host(a), isLater),
      scope === 'late'
        ? this.#pass(this.#byStart.client(a), isLater)
        : this.#pass(this.#sessions.client(a), inSession),
    )
  }

  #pass(run: Run, isAfter: (b: number) => boolean): number {
    const { members } = run
    const { closing } = this.#counting
    while (run.next < members.length && isAfter(members[run.next])) {
      const b = members[run.next++]
      if (this.#scope === 'closing' && closing![b] === 0) continue
      if (this.#level[b] < run.extreme) run.extreme = this.#level[b]
    }
    return run.extreme
  }
}
