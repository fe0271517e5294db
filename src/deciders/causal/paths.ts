/**
 * Why one operation is in the causal past of another: a path with as few changes of session as can be.
 */
import type { CausalHistory } from './causal-history.js'

/** One step of causality between nodes. */
export interface CausalStep {
  readonly type: 'session' | 'returned'
  readonly before: number
  readonly after: number
}

/** A path of causality from node a to node b, or undefined where there is none. O(nodes). */
export function causalPath(causal: CausalHistory, a: number, b: number): CausalStep[] | undefined {
  const { acked, client, from, previous } = causal
  const { place } = causal
  /** node → the steps that lead from it towards b */
  const came = new Map<number, { steps: CausalStep[]; next: number }>()
  const queue = [b]
  came.set(b, { steps: [], next: -1 })
  const collect = (node: number, first: CausalStep[]): CausalStep[] => {
    const path = [...first]
    for (let at = node; at !== b; ) {
      const { steps, next } = came.get(at)!
      path.push(...steps)
      at = next
    }
    return path
  }
  /** node → 1 once its reads-from has been followed */
  const followed = new Set<number>()
  for (let head = 0; head < queue.length; head++) {
    const node = queue[head]
    if (node === a) return collect(node, [])
    const isEarlier =
      client[a] === client[node] &&
      acked[a] === 1 &&
      a !== node &&
      place[a] < place[node] + (acked[node] ? 0 : 1)
    if (isEarlier && a < node) return collect(node, [{ type: 'session', before: a, after: node }])
    for (let y = node; y >= 0 && !followed.has(y); y = previous[y]) {
      followed.add(y)
      const source = from[y]
      if (source < 0 || came.has(source)) continue
      const steps: CausalStep[] = [{ type: 'returned', before: source, after: y }]
      if (y !== node) steps.push({ type: 'session', before: y, after: node })
      came.set(source, { steps, next: node })
      queue.push(source)
    }
  }
  return undefined
}
