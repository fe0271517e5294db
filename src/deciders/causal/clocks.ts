/**
 * Vector clocks over causality: for each write, which operations it depends on.
 *
 * One component a client, how many of its acked operations are in the past, and one bit for each unsure write that
 * was seen: nothing later of its client depends on it, so no count of the client's can stand for it.
 */
import type { CausalHistory } from './causal-history.js'

export interface Causality {
  /** nodes in an order that extends causality; nodes on a cycle or behind one are missing */
  readonly order: Int32Array
  /** nodes on a cycle of causality or behind one */
  readonly stuck: readonly number[]
  /** whether node a is in the causal past of node b. Both ordered; b a write or asked while it is being visited. O(1) */
  isBefore(a: number, b: number): boolean
  /** Visits the ordered nodes; within a visit `isBefore(…, node)` and `past` speak of the node's past. */
  visit(see: (node: number, past: Past) => void): void
}

/** The causal past of the node being visited. */
export interface Past {
  /** how many acked nodes of a client (dense number) are in it */
  of(client: number): number
  /** whether this unsure write is in it */
  hasUnsure(node: number): boolean
}

/** Works out causality. O(n · components), with a row of clocks a write. */
export function causalityOf(causal: CausalHistory, clients: number): Causality {
  const { count, writes, acked, from, previous, client, place } = causal
  const { order, stuck } = topological(causal)
  const unsureBit = new Int32Array(count).fill(-1)
  let unsure = 0
  for (let node = 0; node < count; node++) if (writes[node] && !acked[node]) unsureBit[node] = unsure++
  const words = Math.ceil(unsure / 32)
  const width = clients + words
  const rowOf = new Int32Array(count).fill(-1)
  let rows = 0
  for (let node = 0; node < count; node++) if (writes[node]) rowOf[node] = rows++
  const table = new Int32Array(rows * width)
  /** what a client's acked operations so far depend on, themselves included */
  const sessions = new Int32Array(clients * width)
  const now = new Int32Array(width)
  let visiting = -1

  const isIn = (a: number, clocks: Int32Array, at: number): boolean => {
    const bit = unsureBit[a]
    if (bit >= 0) return (clocks[at + clients + (bit >> 5)] & (1 << (bit & 31))) !== 0
    return clocks[at + client[a]] > place[a]
  }
  const join = (into: Int32Array, intoAt: number, clocks: Int32Array, at: number): void => {
    for (let c = 0; c < clients; c++) if (clocks[at + c] > into[intoAt + c]) into[intoAt + c] = clocks[at + c]
    for (let w = clients; w < width; w++) into[intoAt + w] |= clocks[at + w]
  }
  const past: Past = {
    of: (c) => now[c],
    hasUnsure: (node) => (now[clients + (unsureBit[node] >> 5)] & (1 << (unsureBit[node] & 31))) !== 0,
  }
  return {
    order,
    stuck,
    isBefore: (a, b) => (b === visiting ? isIn(a, now, 0) : isIn(a, table, rowOf[b] * width)),
    visit(see) {
      sessions.fill(0)
      for (const node of order) {
        const own = client[node] * width
        now.fill(0)
        if (previous[node] >= 0) join(now, 0, sessions, own)
        const source = from[node]
        if (source >= 0) {
          join(now, 0, table, rowOf[source] * width)
          if (acked[source]) now[client[source]] = Math.max(now[client[source]], place[source] + 1)
          else now[clients + (unsureBit[source] >> 5)] |= 1 << (unsureBit[source] & 31)
        }
        if (writes[node]) table.set(now, rowOf[node] * width)
        visiting = node
        see(node, past)
        visiting = -1
        if (acked[node]) {
          sessions.set(now, own)
          sessions[own + client[node]] = place[node] + 1
        }
      }
    },
  }
}

/** Kahn's topological sort over session order and reads-from. */
function topological({ count, from, previous }: CausalHistory): { order: Int32Array; stuck: number[] } {
  const waits = new Uint8Array(count)
  const degree = new Int32Array(count + 1)
  const each = (see: (before: number, after: number) => void): void => {
    for (let node = 0; node < count; node++) {
      if (previous[node] >= 0) see(previous[node], node)
      if (from[node] >= 0) see(from[node], node)
    }
  }
  each((before, after) => {
    degree[before + 1]++
    waits[after]++
  })
  for (let node = 0; node < count; node++) degree[node + 1] += degree[node]
  const next = degree.slice(0, count)
  const targets = new Int32Array(degree[count])
  each((before, after) => {
    targets[next[before]++] = after
  })
  const order = new Int32Array(count)
  let tail = 0
  for (let node = 0; node < count; node++) if (waits[node] === 0) order[tail++] = node
  for (let head = 0; head < tail; head++) {
    for (let t = degree[order[head]]; t < degree[order[head] + 1]; t++) {
      if (--waits[targets[t]] === 0) order[tail++] = targets[t]
    }
  }
  const stuck: number[] = []
  for (let node = 0; node < count; node++) if (waits[node] > 0) stuck.push(node)
  return { order: order.subarray(0, tail), stuck }
}
