/**
 * `causal` and `causal-convergence` by their bad patterns (Bouajjani, Enea, Guerraoui and Hamza, "On verifying causal
 * consistency", POPL 2017: CC and CCv).
 *
 * For a read r of x and a session, only the session's last write of x in r's past matters: whatever of its
 * earlier writes shows, the last one shows too, because session order is causal.
 */
import type { History } from '../../history/columns.js'
import type { KeyIndex } from '../../order/key-history.js'
import type { CausalName } from '../../promises/request.js'
import { type CausalHistory, collectCausal, INITIAL, READS_NOTHING } from './causal-history.js'
import { type Causality, causalityOf, type Past } from './clocks.js'

/** A bad pattern that was found. Nodes of `CausalOutcome.causal`. */
export type CausalPattern =
  /** causality has a cycle through these nodes */
  | { readonly name: 'CyclicCO'; readonly cycle: readonly number[] }
  /** the read returned the initial value with this write of its key in its past */
  | { readonly name: 'WriteCOInitRead'; readonly read: number; readonly write: number }
  /** the read returned a version that this write of its key, in its past, had overwritten */
  | { readonly name: 'WriteCORead'; readonly read: number; readonly write: number }
  /** writes that must come in a circle: by causality, or because a read of the next had the one in its past */
  | { readonly name: 'CyclicCF'; readonly cycle: readonly ConflictStep[] }

export interface ConflictStep {
  readonly node: number
  /** the read of the next node's version that had this one in its past; undefined: causality orders them */
  readonly read: number | undefined
}

export interface CausalOutcome {
  readonly verdict: 'holds' | 'broken' | 'undecided'
  readonly causal: CausalHistory
  readonly patterns: readonly CausalPattern[]
  /** no read was put to the test: none has a write of its key in its past */
  readonly untested: boolean
  /** nodes in an order that extends causality, as far as there is one */
  readonly order: Int32Array
  /** under causal-convergence: writes of one key that a read of the latter puts in order, as nodes */
  readonly conflicts: readonly { readonly before: number; readonly after: number }[]
}

/** Decides over the keys that are wanted and in. O(n · components · log n). */
export function decideCausal(
  history: History,
  index: KeyIndex,
  promise: CausalName,
  isWanted: (keyId: number) => boolean,
): CausalOutcome {
  const causal = collectCausal(history, index, isWanted)
  if (causal.keysIn === 0)
    return {
      verdict: 'undecided',
      causal,
      patterns: [],
      untested: true,
      order: new Int32Array(),
      conflicts: [],
    }
  const causality = causalityOf(causal, history.clients.size)
  const patterns: CausalPattern[] = []
  if (causality.stuck.length > 0)
    patterns.push({ name: 'CyclicCO', cycle: findCycle(causal, causality.stuck) })
  const writers = new Writers(causal, history.keys.size)
  const rank = new Int32Array(causal.count)
  causality.order.forEach((node, r) => {
    rank[node] = r
  })
  const conflicts: { before: number; after: number; read: number }[] = []
  let untested = true

  causality.visit((read, past) => {
    const source = causal.from[read]
    if (source === READS_NOTHING) return
    let blame = -1
    writers.lastOf(causal.key[read], past, (write) => {
      if (write === read) return
      untested = false
      if (write === source) return
      // What comes after another in causality comes after it in the order, too.
      if (source === INITIAL || (rank[write] > rank[source] && causality.isBefore(source, write))) {
        if (blame < 0) blame = write
      } else if (promise === 'causal-convergence' && !causality.isBefore(write, source)) {
        conflicts.push({ before: write, after: source, read })
      }
    })
    if (blame < 0) return
    patterns.push({ name: source === INITIAL ? 'WriteCOInitRead' : 'WriteCORead', read, write: blame })
  })
  if (promise === 'causal-convergence' && patterns.length === 0 && conflicts.length > 0) {
    const cycle = conflictCycle(causal, causality, conflicts)
    if (cycle) patterns.push({ name: 'CyclicCF', cycle })
  }
  const isBroken = patterns.length > 0 || causal.wrongReads.length > 0
  return {
    verdict: isBroken ? 'broken' : 'holds',
    causal,
    patterns,
    untested: untested && !isBroken,
    order: causality.order,
    conflicts,
  }
}

/**
 * For each key the acked writes of each client in session order, flat: the groups of key k are
 * `groupOffset[k] … groupOffset[k + 1]`, the writes of group g `nodes[nodeOffset[g] … nodeOffset[g + 1])`; and the
 * unsure writes of a key.
 */
class Writers {
  readonly #causal: CausalHistory
  readonly #groupOffset: Int32Array
  readonly #nodeOffset: Int32Array
  readonly #nodes: Int32Array
  readonly #unsure = new Map<number, number[]>()

  constructor(causal: CausalHistory, keys: number) {
    this.#causal = causal
    const { acked, client, count, key, writes } = causal
    // Nodes stand by client, so a stable sort by key leaves each key's writes in groups of one client.
    const offset = new Int32Array(keys + 1)
    for (let node = 0; node < count; node++) if (writes[node] && acked[node]) offset[key[node] + 1]++
    for (let k = 0; k < keys; k++) offset[k + 1] += offset[k]
    const next = offset.slice(0, keys)
    this.#nodes = new Int32Array(offset[keys])
    for (let node = 0; node < count; node++) {
      if (!writes[node]) continue
      if (acked[node]) this.#nodes[next[key[node]]++] = node
      else this.#unsure.set(key[node], [...(this.#unsure.get(key[node]) ?? []), node])
    }
    this.#groupOffset = new Int32Array(keys + 1)
    const starts: number[] = []
    for (let k = 0; k < keys; k++) {
      for (let at = offset[k]; at < offset[k + 1]; at++) {
        if (at === offset[k] || client[this.#nodes[at]] !== client[this.#nodes[at - 1]]) starts.push(at)
      }
      this.#groupOffset[k + 1] = starts.length
    }
    this.#nodeOffset = Int32Array.from([...starts, this.#nodes.length])
  }

  /** Visits each session's last write of the key in the past, and the unsure ones in it. */
  lastOf(key: number, past: Past, see: (write: number) => void): void {
    const { client, place } = this.#causal
    const nodes = this.#nodes
    for (let g = this.#groupOffset[key]; g < this.#groupOffset[key + 1]; g++) {
      const first = this.#nodeOffset[g]
      const seen = past.of(client[nodes[first]])
      if (seen === 0) continue
      let low = first
      let high = this.#nodeOffset[g + 1]
      while (low < high) {
        const middle = (low + high) >> 1
        if (place[nodes[middle]] < seen) low = middle + 1
        else high = middle
      }
      if (low > first) see(nodes[low - 1])
    }
    if (this.#unsure.size === 0) return
    for (const node of this.#unsure.get(key) ?? []) if (past.hasUnsure(node)) see(node)
  }
}

/** A cycle of causality among stuck nodes: going back from any of them leads into one. */
function findCycle({ from, previous }: CausalHistory, stuck: readonly number[]): number[] {
  const isStuck = new Set(stuck)
  const seen = new Map<number, number>()
  const path: number[] = []
  let node = stuck[0]
  while (!seen.has(node)) {
    seen.set(node, path.length)
    path.push(node)
    node = isStuck.has(from[node]) ? from[node] : previous[node]
  }
  return path.slice(seen.get(node)).reverse()
}

/** A cycle of causality and conflicts, as short as a search from each conflict finds it, or undefined. */
function conflictCycle(
  causal: CausalHistory,
  causality: Causality,
  conflicts: readonly { before: number; after: number; read: number }[],
): ConflictStep[] | undefined {
  // Nodes of conflicts only: between them causality is asked of the clocks.
  const byBefore = new Map<number, { after: number; read: number }[]>()
  for (const { before, after, read } of conflicts) {
    const others = byBefore.get(before)
    if (others) {
      if (!others.some((other) => other.after === after)) others.push({ after, read })
    } else byBefore.set(before, [{ after, read }])
  }
  const core = cyclicNodes(causal, causality, byBefore)
  let best: ConflictStep[] | undefined
  for (const start of core) {
    const cycle = shortestFrom(start, core, causality, byBefore, best?.length ?? Number.POSITIVE_INFINITY)
    if (cycle) best = cycle
    if (best && best.length === 2) break
  }
  return best
}

/** Sources of conflicts on a cycle of causality and conflicts, or between two: Kahn from both ends over all nodes. */
function cyclicNodes(
  { count, from, previous }: CausalHistory,
  { order }: Causality,
  byBefore: ReadonlyMap<number, readonly { after: number; read: number }[]>,
): number[] {
  const edges: [number, number][] = []
  for (const node of order) {
    if (previous[node] >= 0) edges.push([previous[node], node])
    if (from[node] >= 0) edges.push([from[node], node])
  }
  for (const [before, targets] of byBefore) for (const { after } of targets) edges.push([before, after])
  const left = new Uint8Array(count)
  for (const node of order) left[node] = 1
  for (const isForward of [true, false]) {
    const waits = new Int32Array(count)
    const out = new Map<number, number[]>()
    for (const [a, b] of edges) {
      if (!left[a] || !left[b]) continue
      const [before, after] = isForward ? [a, b] : [b, a]
      waits[after]++
      const targets = out.get(before)
      if (targets) targets.push(after)
      else out.set(before, [after])
    }
    const queue: number[] = []
    for (const node of order) if (left[node] && waits[node] === 0) queue.push(node)
    for (let node = queue.pop(); node !== undefined; node = queue.pop()) {
      left[node] = 0
      for (const after of out.get(node) ?? []) if (--waits[after] === 0) queue.push(after)
    }
  }
  return [...byBefore.keys()].filter((node) => left[node] === 1)
}

/** A shortest cycle through `start`: conflicts, and causality from a conflict's end to the next one's source. */
function shortestFrom(
  start: number,
  core: readonly number[],
  causality: Causality,
  byBefore: ReadonlyMap<number, readonly { after: number; read: number }[]>,
  limit: number,
): ConflictStep[] | undefined {
  const came = new Map<number, { from: number; after: number; read: number }>()
  const queue = [start]
  for (let head = 0; head < queue.length && head < 5000; head++) {
    const before = queue[head]
    for (const { after, read } of byBefore.get(before)!) {
      for (const next of core) {
        if (next !== after && !causality.isBefore(after, next)) continue
        if (next === start) {
          const steps: ConflictStep[] = after === next ? [] : [{ node: after, read: undefined }]
          steps.unshift({ node: before, read })
          for (let node = before; node !== start; ) {
            const step = came.get(node)!
            if (step.after !== node) steps.unshift({ node: step.after, read: undefined })
            steps.unshift({ node: step.from, read: step.read })
            node = step.from
          }
          return steps.length < limit ? steps : undefined
        }
        if (came.has(next)) continue
        came.set(next, { from: before, after, read })
        queue.push(next)
      }
    }
  }
  return undefined
}
