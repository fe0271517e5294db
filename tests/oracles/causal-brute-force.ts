/**
 * CC and CCv by their definitions, for differentiated histories (Bouajjani et al. 2017; Perrin et al. 2016):
 * enumerates orders of the writes. Shares no code with src/.
 */
export interface CausalOp {
  readonly client: string
  readonly op: 'read' | 'write' | 'cas'
  readonly key: string
  readonly value: unknown
  readonly expect?: unknown
  readonly unsure?: boolean
}

const readOf = (op: CausalOp): unknown =>
  op.op === 'read' ? op.value : op.op === 'cas' ? op.expect : undefined
const isWrite = (op: CausalOp): boolean => op.op !== 'read'

/** The operations that took effect, and causality between them, closed. */
function causality(ops: readonly CausalOp[]): { nodes: CausalOp[]; co: boolean[][] } {
  const writerOf = (key: string, value: unknown): CausalOp | undefined =>
    ops.find((op) => isWrite(op) && op.key === key && op.value === value)
  // Unsure writes count when somebody read them (through the cas that they are as well).
  const effective = new Set(ops.filter((op) => !op.unsure))
  for (let again = true; again; ) {
    again = false
    for (const op of effective) {
      const value = readOf(op)
      const source = value === undefined || value === null ? undefined : writerOf(op.key, value)
      if (source && !effective.has(source)) {
        effective.add(source)
        again = true
      }
    }
  }
  const nodes = ops.filter((op) => effective.has(op) && (isWrite(op) || !op.unsure))
  const n = nodes.length
  const co = nodes.map((a, i) =>
    nodes.map((b, j) => {
      const session = a.client === b.client && i < j && !a.unsure
      const value = readOf(b)
      return (
        session ||
        (isWrite(a) && value !== undefined && value !== null && a.key === b.key && a.value === value)
      )
    }),
  )
  for (let k = 0; k < n; k++)
    for (let i = 0; i < n; i++) for (let j = 0; j < n; j++) if (co[i][k] && co[k][j]) co[i][j] = true
  return { nodes, co }
}

/** Whether read r returned the last write of its key in its causal past, writes taken in this order. */
function explains(nodes: readonly CausalOp[], co: boolean[][], order: readonly number[], r: number): boolean {
  const last = order.filter((w) => co[w][r] && isWrite(nodes[w]) && nodes[w].key === nodes[r].key).at(-1)
  return (last === undefined ? null : nodes[last].value) === readOf(nodes[r])
}

/** Whether the order, places in `ops`, is one of all that took effect, extends causality, and explains every read. */
export function isArbitration(ops: readonly CausalOp[], order: readonly number[]): boolean {
  if (!extendsCausality(ops, order)) return false
  const { nodes, co } = causality(ops)
  const sequence = order.map((at) => nodes.indexOf(ops[at]))
  return sequence.every((r) => readOf(nodes[r]) === undefined || explains(nodes, co, sequence, r))
}

/** Whether the order, places in `ops`, is one of all that took effect and extends causality. */
export function extendsCausality(ops: readonly CausalOp[], order: readonly number[]): boolean {
  const { nodes, co } = causality(ops)
  const sequence = order.map((at) => nodes.indexOf(ops[at]))
  if (sequence.includes(-1) || new Set(sequence).size !== nodes.length || order.length !== nodes.length)
    return false
  return !sequence.some((b, at) => sequence.slice(at).some((a) => co[a][b]))
}

/** Operations in session order per client; reads of null are of the initial value. */
export function bruteForceCausal(ops: readonly CausalOp[]): { causal: boolean; convergence: boolean } {
  const { nodes, co } = causality(ops)
  if (nodes.some((_, i) => co[i][i])) return { causal: false, convergence: false }
  const reads = nodes.map((_, i) => i).filter((i) => readOf(nodes[i]) !== undefined)
  for (const r of reads) {
    const value = readOf(nodes[r])
    if (value !== null && !nodes.some((w) => isWrite(w) && w.key === nodes[r].key && w.value === value)) {
      return { causal: false, convergence: false }
    }
  }
  const writes = nodes.map((_, i) => i).filter((i) => isWrite(nodes[i]))
  /** Some order of these writes that extends causality and passes the test. */
  const someOrder = (left: number[], order: number[], test: (order: number[]) => boolean): boolean => {
    if (left.length === 0) return test(order)
    return left.some((w) => {
      if (left.some((other) => other !== w && co[other][w])) return false
      return someOrder(
        left.filter((other) => other !== w),
        [...order, w],
        test,
      )
    })
  }
  const causal = reads.every((r) =>
    someOrder(
      writes.filter((w) => co[w][r]),
      [],
      (order) => explains(nodes, co, order, r),
    ),
  )
  const convergence =
    causal && someOrder(writes, [], (order) => reads.every((r) => explains(nodes, co, order, r)))
  return { causal, convergence }
}
