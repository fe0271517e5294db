/**
 * Random keys as a sound store would have answered, and then bent in a place or two. Where `arbitraries.ts` makes
 * records of any kind, most of them far from true, these are true or nearly so: the hard cases, and long ones.
 *
 * Every operation that takes effect does so at one instant, not before its start, and not after its end where it is
 * acked. Hosts' clocks are off by at most the clock error. So a key without a bend holds under every promise.
 */
import fc from 'fast-check'
import type { Family } from './arbitraries.js'
import type { PlainKey, PlainOperation } from './brute-force.js'

export interface LifelikeKey {
  readonly key: PlainKey
  /** how many things were bent; 0: the key holds under every promise */
  readonly bends: number
}

const draft = fc.record({
  client: fc.nat(3),
  gap: fc.nat(3),
  length: fc.nat(5),
  /** where in its time it takes effect, in thousandths */
  place: fc.nat(1000),
  kind: fc.nat(9),
  pick: fc.nat(99),
  outcome: fc.nat(11),
  host: fc.nat(3),
})
type Draft = typeof draft extends fc.Arbitrary<infer T> ? T : never

const bend = fc.record({
  how: fc.constantFrom('answer', 'answer', 'answer', 'lose', 'repeat', 'swap'),
  which: fc.nat(99),
  other: fc.nat(99),
})
type Bend = typeof bend extends fc.Arbitrary<infer T> ? T : never

/** An operation with what only the simulation knows. */
interface Sent {
  readonly d: Draft
  readonly record: PlainOperation & { basis?: unknown }
  /** when it takes effect; undefined: never */
  readonly effect: number | undefined
}

/** Keys of between `least` and `most` operations with that many bends. */
export function lifelikeKey(
  family: Family,
  {
    least = 2,
    most,
    bends: [leastBends, mostBends],
  }: { least?: number; most: number; bends: [number, number] },
): fc.Arbitrary<LifelikeKey> {
  return fc
    .record({
      drafts: fc.array(draft, { minLength: least, maxLength: most, size: 'max' }),
      bends: fc.array(bend, { minLength: leastBends, maxLength: mostBends }),
      clockError: fc.constantFrom(0, 0, 1, 2, 3),
      offsets: fc.array(fc.integer({ min: -3, max: 3 }), { minLength: 8, maxLength: 8 }),
      hosts: fc.constantFrom<Hosts>('none', 'shared', 'some', 'moving'),
      initial: fc.constantFrom<Initial>('none', 'none', 'given', 'unknown'),
      by: fc.constantFrom(1, 1, 2, 5, -1, -3, 0),
      lines: fc.array(fc.nat(1_000_000), { minLength: most, maxLength: most }),
    })
    .map(({ drafts, bends, clockError, offsets, hosts, initial, by, lines }) => {
      const sent = send(drafts, hosts, ['counter', 'sizes', 'mixed'].includes(family))
      const start = startOf(family, initial)
      answer(family, sent, start, by, bends)
      const operations = sent.map(({ record }) => record)
      skew(sent, offsets, clockError)
      const key: PlainKey = { operations: shuffleLines(operations, lines), clockError }
      if (initial === 'given') key.initial = start
      if (initial === 'unknown') key.initialUnknown = true
      return { key, bends: bends.length }
    })
}

type Hosts = 'none' | 'shared' | 'some' | 'moving'
type Initial = 'none' | 'given' | 'unknown'

function startOf(family: Family, initial: Initial): unknown {
  if (initial === 'none')
    return family === 'register' || family === 'cas' || family === 'ambiguous' ? null : 0
  if (family === 'counter' || family === 'sizes') return 7
  if (family === 'mixed') return 2
  // Under `initialUnknown` a value that others write or offer is never taken for the start.
  return family === 'ambiguous' && initial === 'given' ? 'x' : 'first'
}

/** When and by whom everything is sent, in each client's own order. */
function send(drafts: readonly Draft[], hosts: Hosts, counts: boolean): Sent[] {
  const clock = [0, 0, 0, 0]
  const names = ['a', 'b', 'c', 'd']
  return drafts.map((drafted, i) => {
    // What makes a key a counter is an increment on it.
    const d = counts && i === 0 ? { ...drafted, kind: 4 } : drafted
    const c = d.client
    // Room for clocks that differ, where a client changes between them.
    const start = clock[c] + d.gap + (hosts === 'moving' && d.pick % 2 === 0 ? 4 : 0)
    const end = start + d.length
    clock[c] = end
    const record: PlainOperation = { client: names[c], op: 'read', key: 'k', start, end }
    const host = hosts === 'moving' ? d.host : c
    if (hosts === 'shared') record.host = c < 2 ? 'h' : 'i'
    if ((hosts === 'some' || hosts === 'moving') && host < 2)
      record.host = hosts === 'some' ? 'h' : `h${host}`
    if (d.outcome === 0) record.outcome = 'refused'
    if (d.outcome === 1 || d.outcome === 2) record.outcome = 'unsure'
    if (d.outcome === 2) {
      delete record.end
      // The request never came back: somebody goes on under a new name.
      names[c] += "'"
    }
    const isAcked = record.outcome === undefined
    const late = (d.place / 1000) * (isAcked ? d.length : 20)
    const never = record.outcome === 'refused' || (record.outcome === 'unsure' && d.place % 3 === 0)
    return { d, record, effect: never ? undefined : start + late }
  })
}

/** Lets a single copy answer everything in the order of effects. */
function answer(family: Family, sent: Sent[], start: unknown, by: number, bends: readonly Bend[]): void {
  const order = sent
    .map((each, i) => ({ each, i }))
    .sort((a, b) => (a.each.effect ?? Infinity) - (b.each.effect ?? Infinity) || a.i - b.i)
    .map(({ each }) => each)
  const bent = (how: Bend['how'], i: number): boolean =>
    bends.some((b) => b.how === how && b.which % sent.length === i)
  const known: unknown[] = [start]
  let fresh = 0
  let value = start
  order.forEach(({ d, record, effect }, i) => {
    const before = value
    Object.assign(
      record,
      request(family, d, value, known, by, () => ++fresh),
    )
    const isAcked = record.outcome === undefined
    if (isAcked && record.op === 'read') record.value = value
    if (record.op === 'cas') {
      const applies = same(family, record.expect, value)
      if (isAcked && !applies) {
        record.applied = false
        if (family !== 'ambiguous' || d.pick % 2 === 0) record.saw = value
      }
      if (applies && effect !== undefined) value = record.value
    } else if (record.op === 'increment') {
      const count = typeof value === 'number' ? value : 0
      if (effect !== undefined) value = count + (record.by ?? 1) * (bent('repeat', i) ? 2 : 1)
      if (isAcked && d.pick % 5 < 2) record.value = value
    } else if (record.op === 'write' || record.op === 'delete') {
      if (isAcked && family === 'register' && d.pick % 7 === 0) record.basis = before
      if (effect !== undefined) value = record.op === 'delete' ? null : record.value
    }
    known.push(value)
    // What was only offered may be asked for as well, and be what a bent answer returns.
    if (record.op === 'write' && record.outcome === 'refused') known.push(record.value)
    if (record.op === 'cas' && record.applied === false) known.push(record.value)
    if (bent('lose', i)) value = before
  })
  bendAnswers(sent, known, bends, by)
}

function bendAnswers(
  sent: readonly Sent[],
  known: readonly unknown[],
  bends: readonly Bend[],
  by: number,
): void {
  const answers = sent
    .map(({ record }) => record)
    .filter((r) => r.outcome === undefined && (r.op === 'read' || (r.op === 'increment' && 'value' in r)))
  for (const { how, which, other } of bends) {
    if (answers.length === 0) return
    const one = answers[which % answers.length]
    const two = answers[other % answers.length]
    if (how === 'swap') [one.value, two.value] = [two.value, one.value]
    if (how !== 'answer') continue
    const isNear = typeof one.value === 'number' && other % 2 === 0
    one.value = isNear
      ? (one.value as number) + (other % 4 === 0 ? by || 1 : -(by || 1))
      : known[other % known.length]
  }
}

function same(family: Family, a: unknown, b: unknown): boolean {
  return family === 'mixed' ? (a ?? 0) === (b ?? 0) : a === b
}

function request(
  family: Family,
  { kind, pick }: Draft,
  value: unknown,
  known: readonly unknown[],
  by: number,
  fresh: () => number,
): Partial<PlainOperation> {
  const found = pick % 4 === 0 ? known[pick % known.length] : value
  switch (family) {
    case 'register':
      return kind < 4 ? { op: 'write', value: fresh() } : { op: 'read' }
    case 'cas':
      if (kind < 2) return { op: 'write', value: fresh() }
      return kind < 6 ? { op: 'cas', expect: found ?? null, value: fresh() } : { op: 'read' }
    case 'counter':
      return kind < 5 ? { op: 'increment', ...(by === 1 ? {} : { by }) } : { op: 'read' }
    case 'sizes':
      return kind < 5 ? { op: 'increment', by: [1, 2, -1, 3, 0, 10][pick % 6] } : { op: 'read' }
    case 'ambiguous': {
      const next = ['x', 'y'][pick % 2]
      if (kind < 3) return { op: 'write', value: next }
      if (kind === 3) return { op: 'delete' }
      return kind < 6 ? { op: 'cas', expect: found ?? null, value: next } : { op: 'read' }
    }
    case 'mixed':
      if (kind < 2) return { op: 'write', value: pick % 3 }
      if (kind === 2)
        return pick % 2 ? { op: 'delete' } : { op: 'cas', expect: found ?? null, value: pick % 3 }
      return kind < 6 ? { op: 'increment' } : { op: 'read' }
  }
}

/**
 * Stamps every operation by its host's clock, which is off by no more than the clock error; by true clocks where a
 * client moves between hosts and would overlap with itself.
 */
function skew(sent: readonly Sent[], offsets: readonly number[], clockError: number): void {
  const own = new Map<string, number>()
  const offs = sent.map(({ record }) => {
    const clock = record.host ?? `own ${record.client}`
    if (!own.has(clock)) own.set(clock, offsets[own.size % offsets.length])
    return Math.max(-clockError, Math.min(clockError, own.get(clock)!))
  })
  const lastEnd = new Map<string, number>()
  const overlaps = sent.some(({ record }, i) => {
    const before = lastEnd.get(record.client) ?? Number.NEGATIVE_INFINITY
    lastEnd.set(record.client, (record.end ?? record.start) + offs[i])
    return record.start + offs[i] < before
  })
  sent.forEach(({ record }, i) => {
    const off = 10 + (overlaps ? 0 : offs[i])
    record.start += off
    if (record.end !== undefined) record.end += off
  })
}

/** Lines in any order, each client's in its own. */
export function shuffleLines<T extends PlainOperation>(
  operations: readonly T[],
  places: readonly number[],
): T[] {
  const byClient = new Map<string, { op: T; place: number }[]>()
  operations.forEach((op, i) => {
    const list = byClient.get(op.client) ?? []
    byClient.set(op.client, [...list, { op, place: places[i] }])
  })
  return [...byClient.values()]
    .flatMap((list) => {
      const sorted = list.map(({ place }) => place).sort((a, b) => a - b)
      return list.map(({ op }, i) => ({ op, place: sorted[i] }))
    })
    .sort((a, b) => a.place - b.place)
    .map(({ op }) => op)
}
