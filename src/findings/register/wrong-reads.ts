/**
 * Reads that are wrong by themselves: torn rows, values nobody wrote or only refused writes offered, reads that
 * precede the write they returned.
 */
import { CAS, INCREMENT, READ, REFUSED, type Values } from '../../history/columns.js'
import type { Counting } from '../../order/counting.js'
import type { KeyHistory } from '../../order/key-history.js'
import { readValue } from '../../order/roles.js'
import { OFFERED_ONLY, UNWRITTEN, type Versions } from '../../order/versions.js'
import { inOrder } from '../in-order.js'
import type { FindingKind } from '../kinds.js'
import type { Exhibit, Link, RawFinding } from '../raw-finding.js'
import { duration, Teller } from '../telling.js'
import { TornRows } from './torn-row.js'

const tornRows = new WeakMap<KeyHistory, TornRows>()

/** The finding of one wrong read; `also` are the kinds that fit it besides. */
export function wrongReadFinding(
  counting: Counting,
  values: Values,
  versions: Versions,
  operations: Int32Array,
  read: number,
  also: readonly FindingKind[],
): RawFinding {
  const { key } = counting
  const tell = new Teller(key)
  const base = { also, keyId: key.keyId, blamed: key.operation[read] }
  const blamed = { operation: key.operation[read], role: 'the blamed read' }
  const value = readValue(key, read)
  const version = versions.readOf[read]

  if (version === UNWRITTEN) {
    const sources = rowsOf(key, values).sources(value)
    if (sources) {
      const parts: Exhibit[] = sources
        .filter((p) => p >= 0)
        .map((p) => ({ operation: key.operation[p], role: 'a write that a part of it comes from' }))
      const from = sources.map((p) =>
        p < 0 ? 'the initial value' : `${tell.client(p)}'s ${tell.value(key.value[p])}`,
      )
      return {
        ...base,
        kind: 'torn-row',
        cause: sources[sources.length - 1] < 0 ? -1 : key.operation[sources[sources.length - 1]],
        exhibits: inOrder(key, [...parts, blamed]),
        links: [],
        summary: `${tell.client(read)} read ${tell.value(value)} from ${tell.keyName}, which nobody wrote as a whole: it is put together from ${listed(from)}.`,
      }
    }
    return {
      ...base,
      kind: 'unwritten-value',
      cause: -1,
      exhibits: [blamed],
      links: [],
      summary: `${tell.client(read)} read ${tell.value(value)} from ${tell.keyName}, which nobody in this recording wrote.`,
    }
  }
  if (version === OFFERED_ONLY) {
    const offer = offerOf(key, operations, value)
    const refused = key.history.outcome[offer] === REFUSED
    const client = key.history.clients.name(key.history.client[offer])
    return {
      ...base,
      kind: 'refused-write-seen',
      cause: offer,
      exhibits: inOrder(key, [
        { operation: offer, role: refused ? 'the refused write' : 'the cas that failed' },
        blamed,
      ]),
      links: [{ type: 'returned', before: offer, after: key.operation[read] }],
      summary: refused
        ? `${tell.client(read)} read ${tell.value(value)} from ${tell.keyName}, though the store had refused the only write of it, by ${client}.`
        : `${tell.client(read)} read ${tell.value(value)} from ${tell.keyName}, though the only cas that offered it, by ${client}, had failed.`,
    }
  }
  const write = versions.writer[version]
  const links: Link[] = [
    { type: 'pair', before: key.operation[read], after: key.operation[write] },
    { type: 'returned', before: key.operation[write], after: key.operation[read] },
  ]
  return {
    ...base,
    kind: 'early-read',
    cause: key.operation[write],
    exhibits: [blamed, { operation: key.operation[write], role: 'the write of what it returned' }],
    links,
    summary: `${tell.client(read)} read ${tell.value(value)} from ${tell.keyName} ${duration(tell.startNs(write) - tell.endNs(read))} before ${tell.client(write)} began to write it.`,
  }
}

function rowsOf(key: KeyHistory, values: Values): TornRows {
  let rows = tornRows.get(key)
  if (!rows) {
    rows = new TornRows(key, values)
    tornRows.set(key, rows)
  }
  return rows
}

/** The refused write, or else the failed cas, that offered a value. */
function offerOf(key: KeyHistory, operations: Int32Array, value: number): number {
  const { history } = key
  let failed = -1
  for (const i of operations) {
    if (history.value[i] !== value || history.kind[i] === READ || history.kind[i] === INCREMENT) continue
    if (history.outcome[i] === REFUSED) return i
    if (history.kind[i] === CAS && history.applied[i] === 0) failed = i
  }
  return failed
}

function listed(parts: readonly string[]): string {
  return parts.length < 2 ? parts.join('') : `${parts.slice(0, -1).join(', ')} and ${parts[parts.length - 1]}`
}
