/**
 * The operations of all register keys whose reads name their versions, with what causality is made of: session order
 * and reads-from (semantics.md, "Several keys").
 *
 * Nodes count in session order of their clients, so that a client's run in one row; a node is an operation that took
 * effect and carries information. An unsure operation has causal predecessors, but nothing later of its client
 * depends on it.
 */
import { CAS, type History } from '../../history/columns.js'
import { gatherKey, type KeyIndex } from '../../order/key-history.js'
import { findVersions, OFFERED_ONLY, UNWRITTEN } from '../../order/versions.js'

/** In `CausalHistory.from`: the node reads nothing. */
export const READS_NOTHING = -1
/** In `CausalHistory.from`: it returned the initial value of its key. */
export const INITIAL = -2

export interface CausalHistory {
  readonly count: number
  /** node → operation index in the history */
  readonly operation: Int32Array
  readonly client: Int32Array
  readonly key: Int32Array
  /** node → 1 when it writes */
  readonly writes: Uint8Array
  /** node → 1 when acked */
  readonly acked: Uint8Array
  /** node → node whose version it read or found, INITIAL or READS_NOTHING */
  readonly from: Int32Array
  /** node → the last acked node before it in its session, or -1 */
  readonly previous: Int32Array
  /** node → how many acked nodes of its client come before it */
  readonly place: Int32Array
  /** reads of values that nobody wrote, or only refused writes, as operation indices with their key's local index */
  readonly wrongReads: readonly { keyId: number; local: number }[]
  readonly keysIn: number
  /** ids of the keys that are in */
  readonly keyIds: readonly number[]
  readonly keysLeftOut: number
}

/** Collects the nodes of the keys that are in. O(n log n). */
export function collectCausal(
  history: History,
  index: KeyIndex,
  isWanted: (keyId: number) => boolean,
): CausalHistory {
  const nodeOf = new Int32Array(history.count).fill(-1)
  const operations: number[] = []
  const readsFrom = new Map<number, number>()
  const wrongReads: { keyId: number; local: number }[] = []
  let keysIn = 0
  const keyIds: number[] = []
  let keysLeftOut = 0
  for (let keyId = 0; keyId + 1 < index.offset.length; keyId++) {
    if (index.offset[keyId] === index.offset[keyId + 1] || !isWanted(keyId)) continue
    const key = gatherKey(history, index, keyId, 0n)
    const versions = key.hasIncrements ? undefined : findVersions(key)
    if (!versions || versions.ambiguous >= 0) {
      keysLeftOut++
      continue
    }
    keysIn++
    keyIds.push(keyId)
    // An unsure cas that was seen took effect, so it found what it expected.
    if (versions.impossibleCas >= 0) wrongReads.push({ keyId, local: versions.impossibleCas })
    for (let p = 0; p < key.n; p++) {
      const seen = versions.readOf[p]
      const written = versions.writeOf[p]
      if (seen === UNWRITTEN || seen === OFFERED_ONLY) wrongReads.push({ keyId, local: p })
      const found = written > 0 && key.kind[p] === CAS ? versions.found[written] : seen
      if (written < 0 && found < 0) continue
      operations.push(key.operation[p])
      if (found >= 0)
        readsFrom.set(key.operation[p], found === 0 ? INITIAL : key.operation[versions.writer[found]])
    }
  }
  sortBySession(history, operations)
  const count = operations.length
  operations.forEach((operation, node) => {
    nodeOf[operation] = node
  })
  const client = new Int32Array(count)
  const key = new Int32Array(count)
  const writes = new Uint8Array(count)
  const acked = new Uint8Array(count)
  const from = new Int32Array(count).fill(READS_NOTHING)
  const previous = new Int32Array(count).fill(-1)
  const place = new Int32Array(count)
  let last = -1
  let acks = 0
  for (let node = 0; node < count; node++) {
    const i = operations[node]
    if (node === 0 || history.client[i] !== client[node - 1]) {
      last = -1
      acks = 0
    }
    client[node] = history.client[i]
    key[node] = history.key[i]
    acked[node] = history.outcome[i] === 0 ? 1 : 0
    writes[node] = history.kind[i] !== 0 && !(history.kind[i] === CAS && history.applied[i] === 0) ? 1 : 0
    const source = readsFrom.get(i)
    if (source !== undefined) from[node] = source === INITIAL ? INITIAL : nodeOf[source]
    previous[node] = last
    place[node] = acks
    if (acked[node]) {
      last = node
      acks++
    }
  }
  return {
    count,
    operation: Int32Array.from(operations),
    client,
    key,
    writes,
    acked,
    from,
    previous,
    place,
    wrongReads,
    keysIn,
    keyIds,
    keysLeftOut,
  }
}

/** By client, then session order across keys: (start, end, input). */
function sortBySession(history: History, operations: number[]): void {
  const { client, hasEnd, times } = history
  const { startOffset, endOffset } = times
  const start = (i: number): number | bigint => (startOffset ? startOffset[i] : times.startNs(i))
  const end = (i: number): number | bigint => (endOffset ? endOffset[i] : times.endNs(i))
  operations.sort((a, b) => {
    if (client[a] !== client[b]) return client[a] - client[b]
    const [sa, sb] = [start(a), start(b)]
    if (sa !== sb) return sa < sb ? -1 : 1
    if (hasEnd[a] !== hasEnd[b]) return hasEnd[b] - hasEnd[a]
    const [ea, eb] = [end(a), end(b)]
    return ea !== eb ? (ea < eb ? -1 : 1) : a - b
  })
}
