/**
 * `causal` and `causal-convergence` by their bad patterns (Bouajjani, Enea, Guerraoui and Hamza 2017), over an order
 * that extends causality, or over the few operations of a counterexample.
 */
import type { CausalKeys } from './causal-keys.js'
import type { Recorded } from './recorded.js'

/** What causally precedes an operation. */
interface Past {
  /** client → how many of its acked operations that take part */
  readonly of: Int32Array
  readonly unsure: Set<number>
}

/** Why the order proves nothing, or undefined where it proves the promise kept. One pass, with vector clocks. */
export function causalOrderTrouble(
  keys: CausalKeys,
  order: readonly number[],
  converges: boolean,
): string | undefined {
  const { takesPart, unwritten } = keys
  if (unwritten.length > 0) return `operation ${unwritten[0]} returned what nobody wrote`
  const place = new Int32Array(keys.recorded.history.count).fill(-1)
  for (const [at, i] of order.entries()) {
    if (!takesPart.has(i)) return `operation ${i} does not take part`
    if (place[i] >= 0) return `operation ${i} stands in the order twice`
    place[i] = at
  }
  for (const i of takesPart) if (place[i] < 0) return `operation ${i} is missing in the order`
  const walk = new Walk(keys, place, converges)
  for (const i of order) {
    const trouble = walk.step(i)
    if (trouble) return trouble
  }
  return undefined
}

class Walk {
  readonly #keys: CausalKeys
  readonly #recorded: Recorded
  /** operation → its place in the order */
  readonly #place: Int32Array
  readonly #converges: boolean
  /** client → what its next operation depends on */
  readonly #now = new Map<number, Past>()
  /** client → its last acked operation, and its unsure ones */
  readonly #last = new Map<number, number>()
  readonly #unsure = new Map<number, number[]>()
  /** of clients with unsure operations: what they depended on after each acked one */
  readonly #steps = new Map<number, { i: number; past: Past }[]>()
  /** acked operation → its place in its session */
  readonly #at: Int32Array
  /** write → its past, itself included */
  readonly #pastOf = new Map<number, Past>()
  /** key → client → the client's acked writes of the key so far */
  readonly #writesOf = new Map<number, Map<number, number[]>>()

  constructor(keys: CausalKeys, place: Int32Array, converges: boolean) {
    this.#keys = keys
    this.#recorded = keys.recorded
    this.#place = place
    this.#at = new Int32Array(place.length)
    this.#converges = converges
    for (const i of keys.takesPart)
      if (!keys.recorded.isAcked(i)) this.#steps.set(keys.recorded.history.client[i], [])
  }

  step(i: number): string | undefined {
    const { client, key } = this.#recorded.history
    const c = client[i]
    const isAcked = this.#recorded.isAcked(i)
    const last = this.#last.get(c)
    const isLate = isAcked
      ? (last !== undefined && !this.#recorded.inSession(last, i)) ||
        this.#unsure.get(c)?.some((u) => this.#recorded.inSession(i, u))
      : false
    if (isLate) return `operation ${i} stands after a later one of its client in the order`
    // Nothing later depends on an unsure operation, so later ones may stand before it.
    const past = isAcked ? (this.#now.get(c) ?? this.#copy(undefined)) : this.#copy(this.#pastAt(i))
    const v = this.#keys.source.get(i)
    if (v !== undefined) {
      if (v >= 0) {
        const seen = this.#pastOf.get(v)
        if (!seen) return `operation ${i} stands before the write that it saw in the order`
        seen.of.forEach((n, d) => {
          if (n > past.of[d]) past.of[d] = n
        })
        for (const u of seen.unsure) past.unsure.add(u)
      }
      for (const w of this.#newest(past, key[i])) {
        // What stands before v in the order does not depend on it.
        if (w === v || (v >= 0 && this.#place[w] < this.#place[v])) continue
        if (v < 0) return `operation ${i} returned the initial value, and it depends on ${w}, a write over it`
        if (this.#isIn(v, this.#pastOf.get(w)!))
          return `operation ${i} returned what ${w}, on which it depends, had overwritten`
        if (this.#converges) return `operation ${w} must come before ${v} in the order`
      }
    }
    if (isAcked) {
      this.#at[i] = past.of[c]
      past.of[c]++
      this.#now.set(c, past)
      this.#steps.get(c)?.push({ i, past: this.#copy(past) })
      this.#last.set(c, i)
    } else {
      past.unsure.add(i)
      this.#unsure.set(c, [...(this.#unsure.get(c) ?? []), i])
    }
    if (!this.#recorded.writes(i)) return undefined
    this.#pastOf.set(i, this.#copy(past))
    if (!isAcked) return undefined
    const ofKey = this.#writesOf.get(key[i]) ?? new Map<number, number[]>()
    this.#writesOf.set(key[i], ofKey)
    const writes = ofKey.get(c)
    if (writes) writes.push(i)
    else ofKey.set(c, [i])
    return undefined
  }

  #copy(past: Past | undefined): Past {
    const { clients } = this.#recorded.history
    return { of: past ? past.of.slice() : new Int32Array(clients.size), unsure: new Set(past?.unsure) }
  }

  /** What a client depended on when it sent an unsure operation. */
  #pastAt(i: number): Past | undefined {
    const steps = this.#steps.get(this.#recorded.history.client[i])
    return steps?.findLast((step) => this.#recorded.inSession(step.i, i))?.past
  }

  /** Of each session the last write of the key in a past, and the unsure ones: what they show, earlier ones do not. */
  #newest(past: Past, keyId: number): number[] {
    const { key } = this.#recorded.history
    const newest = [...past.unsure].filter((u) => key[u] === keyId)
    for (const [d, writes] of this.#writesOf.get(keyId) ?? []) {
      const last = writes.findLast((w) => this.#at[w] < past.of[d])
      if (last !== undefined) newest.push(last)
    }
    return newest
  }

  #isIn(v: number, past: Past): boolean {
    if (!this.#recorded.isAcked(v)) return past.unsure.has(v)
    return this.#at[v] < past.of[this.#recorded.history.client[v]]
  }
}

/** Most operations of a counterexample whose paths are all worked out. */
export const PATHS_LIMIT = 300

/** Whether these operations show a bad pattern by themselves. */
export function hasBadPattern(keys: CausalKeys, operations: readonly number[], converges: boolean): boolean {
  const { recorded, source } = keys
  const { key } = recorded.history
  const ops = operations.filter((i) => keys.takesPart.has(i))
  const n = ops.length
  const at = new Map(ops.map((i, a) => [i, a]))
  const reaches = ops.map((a) =>
    ops.map((b) => (recorded.isAcked(a) && recorded.inSession(a, b)) || source.get(b) === a),
  )
  close(reaches)
  if (reaches.some((row, a) => row[a])) return true
  const conflicts = reaches.map((row) => [...row])
  for (let r = 0; r < n; r++) {
    const v = source.get(ops[r])
    if (v === undefined) continue
    for (let w = 0; w < n; w++) {
      if (ops[w] === v || !recorded.writes(ops[w]) || key[ops[w]] !== key[ops[r]] || !reaches[w][r]) continue
      if (v < 0) return true
      const from = at.get(v)
      if (from === undefined) continue
      if (reaches[from][w]) return true
      conflicts[w][from] = true
    }
  }
  if (!converges) return false
  close(conflicts)
  return conflicts.some((row, a) => row[a])
}

/** Transitive closure (Warshall 1962). */
function close(reaches: boolean[][]): void {
  const n = reaches.length
  for (let k = 0; k < n; k++)
    for (let i = 0; i < n; i++)
      if (reaches[i][k]) for (let j = 0; j < n; j++) if (reaches[k][j]) reaches[i][j] = true
}
