/**
 * Random tiny keys: few clients, times from a small range so that ties, overlaps and operations of no length
 * abound, values likely to be the ones that stood there, so that a good part of the histories holds.
 */
import fc from 'fast-check'
import type { PlainKey, PlainOperation } from './brute-force.js'

export type Family = 'register' | 'cas' | 'counter' | 'sizes' | 'ambiguous' | 'mixed'

interface Draft {
  client: number
  gap: number
  length: number
  kind: number
  pick: number
  outcome: number
  host: number
  extra: number
}

const draft = fc.record({
  client: fc.integer({ min: 0, max: 2 }),
  gap: fc.integer({ min: 0, max: 4 }),
  length: fc.integer({ min: 0, max: 6 }),
  kind: fc.integer({ min: 0, max: 9 }),
  pick: fc.integer({ min: 0, max: 5 }),
  outcome: fc.integer({ min: 0, max: 11 }),
  host: fc.integer({ min: 0, max: 5 }),
  extra: fc.integer({ min: 0, max: 9 }),
})

/** Keys of one family with up to `size` operations. */
export function tinyKey(family: Family, size = 7): fc.Arbitrary<PlainKey> {
  return fc
    .record({
      drafts: fc.array(draft, { minLength: 1, maxLength: size }),
      clockError: fc.constantFrom(0, 0, 0, 1, 2),
      initial: fc.constantFrom('none', 'none', 'none', 'given', 'unknown'),
      hosts: fc.constantFrom(0, 0, 1, 2),
      order: fc.infiniteStream(fc.nat(1000)),
    })
    .map(({ drafts, clockError, initial, hosts, order }) => {
      const operations = build(family, drafts, hosts)
      // Lines in any order: only a client's zero-length ties go by line, and those may go any way too.
      const keyed = operations.map((op) => ({ op, place: order.next().value as number }))
      keyed.sort((a, b) => a.place - b.place)
      const key: PlainKey = { operations: keyed.map(({ op }) => op), clockError }
      const counter = family === 'counter' || family === 'sizes'
      if (initial === 'given') key.initial = counter ? 3 : family === 'mixed' ? 2 : 'first'
      if (initial === 'unknown') key.initialUnknown = true
      return key
    })
}

function build(family: Family, drafts: Draft[], hosts: number): PlainOperation[] {
  const clock = [0, 1, 2]
  const open = [false, false, false]
  const name = ['a', 'b', 'c']
  const operations: PlainOperation[] = []
  const values: unknown[] = [null]
  let fresh = 0
  for (const d of drafts) {
    if (open[d.client]) {
      // The request of the old name never came back: a new name goes on.
      open[d.client] = false
      name[d.client] += "'"
    }
    const start = clock[d.client] + d.gap
    const end = start + d.length
    clock[d.client] = end
    const op = operation(family, d, values, () => ++fresh)
    const record: PlainOperation = { client: name[d.client], key: 'k', start, end, ...op }
    if (hosts === 1 && d.host < 4) record.host = 'h'
    if (hosts === 2 && d.host < 4) record.host = d.host < 2 ? 'h' : 'i'
    if (record.op !== 'read') {
      if (d.outcome === 0) record.outcome = 'refused'
      if (d.outcome === 1 || d.outcome === 2) record.outcome = 'unsure'
      if (d.outcome === 2) {
        delete record.end
        open[d.client] = true
      }
    }
    operations.push(record)
  }
  return operations
}

function operation(
  family: Family,
  d: Draft,
  values: unknown[],
  fresh: () => number,
): Pick<PlainOperation, 'op'> & Partial<PlainOperation> {
  const counter = family === 'counter' || family === 'sizes'
  const old = values[Math.max(0, values.length - 1 - (d.pick % 3))]
  if (counter) {
    const by = family === 'sizes' ? [1, 2, -1, 3, 1, 2][d.pick] : undefined
    if (d.kind < 5) {
      const count = d.extra < 3 ? { value: d.pick } : {}
      return { op: 'increment', ...(by === undefined ? {} : { by }), ...count }
    }
    return { op: 'read', value: d.extra === 0 ? null : d.pick % 4 }
  }
  if (family === 'mixed') {
    if (d.kind < 2) return { op: 'write', value: d.pick % 3 }
    if (d.kind === 2)
      return d.extra < 3 ? { op: 'delete' } : { op: 'cas', expect: d.pick % 3, value: d.extra % 3 }
    if (d.kind < 6) return { op: 'increment', ...(d.extra < 2 ? { value: d.pick % 4 } : {}) }
    return { op: 'read', value: d.extra === 0 ? null : d.pick % 4 }
  }
  if (family === 'ambiguous') {
    const some = ['x', 'y', null][d.pick % 3]
    if (d.kind < 3) return { op: 'write', value: ['x', 'y'][d.pick % 2] }
    if (d.kind === 3) return { op: 'delete' }
    if (d.kind === 4) {
      return d.extra < 4
        ? {
            op: 'cas',
            expect: some,
            value: ['x', 'y'][d.extra % 2],
            applied: false,
            ...(d.extra < 2 ? { saw: ['y', null, 'x'][d.pick % 3] } : {}),
          }
        : { op: 'cas', expect: some, value: ['x', 'y'][d.extra % 2] }
    }
    return { op: 'read', value: some }
  }
  // register and cas: every value written once
  if (d.kind < (family === 'cas' ? 2 : 4)) {
    const value = fresh()
    values.push(value)
    return { op: 'write', value }
  }
  if (family === 'cas' && d.kind < 6) {
    const value = fresh()
    if (d.extra < 2) return { op: 'cas', expect: old, value, applied: false, saw: old }
    values.push(value)
    return { op: 'cas', expect: old, value }
  }
  if (d.extra === 0) return { op: 'read', value: 'first' }
  if (d.extra === 1) return { op: 'read', value: fresh() }
  return { op: 'read', value: old }
}

/** The history text of a key. */
export function keyText(key: PlainKey): string {
  const header: Record<string, unknown> = { history: 1 }
  if (key.clockError > 0) header.clockError = key.clockError
  if (key.initial !== undefined) header.initial = { k: key.initial }
  if (key.initialUnknown) header.initialUnknown = true
  return [header, ...key.operations]
    .map((record) => JSON.stringify(record))
    .join('\n')
    .concat('\n')
}
