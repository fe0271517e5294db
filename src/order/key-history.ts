/**
 * The operations on one key, gathered out of the history's columns into dense arrays of their own: what every
 * decider works on.
 *
 * Refused operations stay out, and so do reads that are unsure (neither carries information). What remains is
 * sorted by (start, end, input order), and *local* indices `0 … n-1` count in that order. It is a linear
 * extension of precedence, and the operations of one client stand in session order in it.
 *
 * Times are doubles that compare exactly as the recorded nanoseconds do. `sureEnd` is the end by which every
 * other host certainly knows the operation over: end + 2·clockError. Infinity where the request never came back
 * or where the outcome is unsure does not matter: an unsure operation precedes nothing anyway.
 */
import {
  ACKED,
  CAS,
  DELETE,
  type History,
  INCREMENT,
  NO_VALUE,
  READ,
  REFUSED,
  UNSURE,
} from '../history/columns.js'

export interface KeyHistory {
  /** where it was gathered from, for exact times and names */
  readonly history: History
  /** the clock error that it was gathered under, in nanoseconds */
  readonly clockErrorNs: bigint
  /** the key's id in the history */
  readonly keyId: number
  readonly n: number
  /** local index → operation index in the history */
  readonly operation: Int32Array
  readonly client: Int32Array
  /** clock: equal numbers mean one clock (as in History.host) */
  readonly host: Int32Array
  /** READ … DELETE */
  readonly kind: Uint8Array
  /** 1 acked, 0 unsure */
  readonly acked: Uint8Array
  /** cas: 0 when acked and the comparison failed; else 1 */
  readonly applied: Uint8Array
  /** value ids as in History */
  readonly value: Int32Array
  readonly extra: Int32Array
  /** value id of a failed cas's `saw`, or NO_VALUE */
  readonly saw: Int32Array
  readonly start: Float64Array
  /** Infinity when the request never came back */
  readonly end: Float64Array
  /** end + 2·clockError, comparable with `start` */
  readonly sureEnd: Float64Array
  /** value id of the initial value (NULL_VALUE where none is given), or NO_VALUE when it is unknown */
  readonly initial: number
  /** value ids that only refused writes or failed cas offered may stand here: every id offered without effect */
  readonly offered: ReadonlySet<number>
  /** true when the key's records, whatever their outcome, hold increments */
  readonly hasIncrements: boolean
  /** true when they hold writes, cas or deletes */
  readonly hasWrites: boolean
}

/** Operations of a history by key: `operations[offset[k] … offset[k + 1])` are key k's, in input order. */
export interface KeyIndex {
  readonly offset: Int32Array
  readonly operations: Int32Array
  /** the columns in the same order, where a key's operations stand far apart in the history's own */
  readonly columns: OperationColumns | undefined
}

/** The columns that a key is gathered from, indexed by operation or by place in a KeyIndex. */
interface OperationColumns {
  readonly client: Int32Array
  readonly host: Int32Array
  readonly kind: Uint8Array
  readonly outcome: Uint8Array
  readonly applied: Uint8Array
  readonly value: Int32Array
  readonly extra: Int32Array
  readonly hasEnd: Uint8Array
  readonly startOffset: Float64Array | undefined
  readonly endOffset: Float64Array | undefined
}

/** From so many keys on the columns are copied into key order: gathering would miss the cache at every step. */
const REGROUPED_FROM = 256

/** Groups the operations by key with one counting sort, O(operations + keys). */
export function indexByKey(history: History): KeyIndex {
  const keys = history.keys.size
  const offset = new Int32Array(keys + 1)
  const { key, count, times } = history
  for (let i = 0; i < count; i++) offset[key[i] + 1]++
  for (let k = 0; k < keys; k++) offset[k + 1] += offset[k]
  const next = offset.slice(0, keys)
  const operations = new Int32Array(count)
  const place = new Int32Array(count)
  for (let i = 0; i < count; i++) {
    const at = next[key[i]]++
    place[i] = at
    operations[at] = i
  }
  if (keys < REGROUPED_FROM) return { offset, operations, columns: undefined }
  const columns = {
    client: scattered(history.client, place, new Int32Array(count)),
    host: scattered(history.host, place, new Int32Array(count)),
    kind: scattered(history.kind, place, new Uint8Array(count)),
    outcome: scattered(history.outcome, place, new Uint8Array(count)),
    applied: scattered(history.applied, place, new Uint8Array(count)),
    value: scattered(history.value, place, new Int32Array(count)),
    extra: scattered(history.extra, place, new Int32Array(count)),
    hasEnd: scattered(history.hasEnd, place, new Uint8Array(count)),
    startOffset: times.startOffset && scattered(times.startOffset, place, new Float64Array(count)),
    endOffset: times.endOffset && scattered(times.endOffset, place, new Float64Array(count)),
  }
  return { offset, operations, columns }
}

/** Entry i of a column goes to place[i]: read in a row, written to as many streams as there are keys. */
function scattered<A extends Int32Array | Uint8Array | Float64Array>(
  column: A,
  place: Int32Array,
  into: A,
): A {
  for (let i = 0; i < place.length; i++) into[place[i]] = column[i]
  return into
}

/**
 * Gathers one key. `clockErrorNs` is the bound to decide under, not necessarily the history's own.
 * O(n log n) at worst, near O(n) on recordings that are nearly sorted.
 */
export function gatherKey(
  history: History,
  index: KeyIndex,
  keyId: number,
  clockErrorNs: bigint,
): KeyHistory {
  const from = index.offset[keyId]
  const to = index.offset[keyId + 1]
  if (!index.columns)
    return gatherOperations(history, index.operations.subarray(from, to), keyId, clockErrorNs)
  const places = new Int32Array(to - from)
  for (let p = from; p < to; p++) places[p - from] = p
  return gather(history, index.columns, places, index.operations, keyId, clockErrorNs)
}

/** As `gatherKey`, over any operations of one key, given in input order. */
export function gatherOperations(
  history: History,
  operations: Int32Array,
  keyId: number,
  clockErrorNs: bigint,
): KeyHistory {
  const { startOffset, endOffset } = history.times
  return gather(history, { ...history, startOffset, endOffset }, operations, undefined, keyId, clockErrorNs)
}

/** Gathers entries of columns; `operationOf` tells the operation of an entry, where they are not the same. */
function gather(
  history: History,
  columns: OperationColumns,
  operations: Int32Array,
  operationOf: Int32Array | undefined,
  keyId: number,
  clockErrorNs: bigint,
): KeyHistory {
  const { client, host, kind, outcome, applied, value, extra } = columns
  const { saw } = history
  const offered = new Set<number>()
  let hasIncrements = false
  let hasWrites = false
  const kept = new Int32Array(operations.length)
  let n = 0
  for (let at = 0; at < operations.length; at++) {
    const i = operations[at]
    const k = kind[i]
    if (k === INCREMENT) hasIncrements = true
    else if (k !== READ) hasWrites = true
    if (outcome[i] !== ACKED || k === CAS) {
      if (outcome[i] === REFUSED || (k === CAS && applied[i] === 0)) {
        if (k !== READ && k !== INCREMENT) offered.add(value[i])
      }
      if (outcome[i] === REFUSED || (k === READ && outcome[i] === UNSURE)) continue
    }
    kept[n++] = i
  }
  const times = gatherTimes(history, columns, kept.subarray(0, n), operationOf, clockErrorNs)
  const order = sortedOrder(n, times.start, times.end)

  const initial = history.initial.get(keyId)
  const result = {
    history,
    clockErrorNs,
    keyId,
    n,
    operation: new Int32Array(n),
    client: new Int32Array(n),
    host: new Int32Array(n),
    kind: new Uint8Array(n),
    acked: new Uint8Array(n),
    applied: new Uint8Array(n),
    value: new Int32Array(n),
    extra: new Int32Array(n),
    saw: new Int32Array(n).fill(NO_VALUE),
    start: new Float64Array(n),
    end: new Float64Array(n),
    sureEnd: new Float64Array(n),
    initial: initial ?? (history.initialUnknown ? NO_VALUE : 0),
    offered,
    hasIncrements,
    hasWrites,
  }
  for (let p = 0; p < n; p++) {
    const from = order[p]
    const i = kept[from]
    const operation = operationOf ? operationOf[i] : i
    result.operation[p] = operation
    result.client[p] = client[i]
    result.host[p] = host[i]
    result.kind[p] = kind[i]
    result.acked[p] = outcome[i] === ACKED ? 1 : 0
    result.applied[p] = applied[i]
    result.value[p] = kind[i] === DELETE ? 0 : value[i]
    result.extra[p] = extra[i]
    if (saw) result.saw[p] = saw[operation]
    result.start[p] = times.start[from]
    result.end[p] = times.end[from]
    result.sureEnd[p] = times.sureEnd[from]
  }
  return result
}

interface KeyTimes {
  start: Float64Array
  end: Float64Array
  sureEnd: Float64Array
}

/** Times of the given entries as doubles that compare as the exact ones do. */
function gatherTimes(
  history: History,
  { startOffset, endOffset, hasEnd }: OperationColumns,
  entries: Int32Array,
  operationOf: Int32Array | undefined,
  clockErrorNs: bigint,
): KeyTimes {
  const n = entries.length
  const uncertainty = 2n * clockErrorNs
  if (!startOffset || !endOffset || uncertainty > 2n ** 52n) {
    return rankTimes(history, operationOf ? entries.map((i) => operationOf[i]) : entries, uncertainty)
  }
  const start = new Float64Array(n)
  const end = new Float64Array(n)
  const sureEnd = new Float64Array(n)
  const add = Number(uncertainty)
  for (let p = 0; p < n; p++) {
    const i = entries[p]
    start[p] = startOffset[i]
    end[p] = hasEnd[i] ? endOffset[i] : Number.POSITIVE_INFINITY
    sureEnd[p] = end[p] + add
  }
  return { start, end, sureEnd }
}

/** Spans that no double holds: every time is replaced by its rank among all that will be compared. */
function rankTimes(history: History, operations: Int32Array, uncertainty: bigint): KeyTimes {
  const n = operations.length
  const exact: bigint[] = []
  for (const i of operations) {
    const startNs = history.times.startNs(i)
    const endNs = history.hasEnd[i] ? history.times.endNs(i) : startNs
    exact.push(startNs, endNs, endNs + uncertainty)
  }
  const distinct = [...new Set(exact)].sort((a, b) => (a < b ? -1 : a > b ? 1 : 0))
  const rank = new Map(distinct.map((t, r) => [t, r]))
  const start = new Float64Array(n)
  const end = new Float64Array(n)
  const sureEnd = new Float64Array(n)
  for (let p = 0; p < n; p++) {
    const open = history.hasEnd[operations[p]] === 0
    start[p] = rank.get(exact[3 * p])!
    end[p] = open ? Number.POSITIVE_INFINITY : rank.get(exact[3 * p + 1])!
    sureEnd[p] = open ? Number.POSITIVE_INFINITY : rank.get(exact[3 * p + 2])!
  }
  return { start, end, sureEnd }
}

/** Positions sorted by (start, end, position). Recordings come nearly sorted: insertion first, within a bound. */
function sortedOrder(n: number, start: Float64Array, end: Float64Array): Int32Array {
  const order = new Int32Array(n)
  for (let p = 0; p < n; p++) order[p] = p
  const before = (a: number, b: number): boolean =>
    start[a] < start[b] || (start[a] === start[b] && (end[a] < end[b] || (end[a] === end[b] && a < b)))
  let work = 8 * n
  for (let p = 1; p < n; p++) {
    const moved = order[p]
    let q = p - 1
    while (q >= 0 && before(moved, order[q])) {
      order[q + 1] = order[q]
      q--
      if (--work < 0) {
        order[q + 1] = moved
        return order.sort((a, b) => (before(a, b) ? -1 : 1))
      }
    }
    order[q + 1] = moved
  }
  return order
}
