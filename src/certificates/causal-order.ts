/**
 * An order of all operations that extends causality and, for `causal-convergence`, the order of conflicting writes.
 */
import type { CausalOutcome } from '../deciders/causal/decide.js'

/** Operation indices in that order; the outcome is one that holds. Kahn's topological sort (1962). */
export function causalOrder({ causal, order, conflicts }: CausalOutcome): number[] {
  const { count, from, previous, operation } = causal
  if (conflicts.length === 0) return Array.from(order, (node) => operation[node])
  const waits = new Int32Array(count)
  const after: number[][] = Array.from({ length: count }, () => [])
  const edge = (a: number, b: number): void => {
    after[a].push(b)
    waits[b]++
  }
  for (let node = 0; node < count; node++) {
    if (previous[node] >= 0) edge(previous[node], node)
    if (from[node] >= 0) edge(from[node], node)
  }
  for (const { before, after: later } of conflicts) edge(before, later)
  const sorted: number[] = []
  for (let node = 0; node < count; node++) if (waits[node] === 0) sorted.push(node)
  for (let head = 0; head < sorted.length; head++) {
    for (const node of after[sorted[head]]) if (--waits[node] === 0) sorted.push(node)
  }
  return sorted.map((node) => operation[node])
}
