/**
 * Keys that are hard to decide: a register under concurrent clients that write few distinct values over and over, some
 * requests without an answer. Deterministic by seed.
 */
import type { PlainKey, PlainOperation } from '../oracles/brute-force.js'
import { generator } from './generator.js'

export interface HardKey {
  readonly operations: number
  readonly clients: number
  readonly values: number
  /** share of the writes that get no answer; half of them took effect, some of those late */
  readonly unsure: number
  /**
   * `stale read`: one client sees a value that was written only long before, now and then, and overwritten.
   * `turns`: a client more reads two values in turn, once more often than there are writes of the first that it can
   * see. Each of these reads by itself has a write that explains it.
   */
  readonly planted?: 'stale read' | 'turns' | undefined
  readonly seed: number
}

/** A register that is truly linearizable, but for what is planted. Requests take 100 to 2,000 time units. */
export function makeHardKey({ operations, clients, values, unsure, planted, seed }: HardKey): PlainKey {
  const random = generator(seed)
  const nextFree = Array.from({ length: clients }, () => random() * 1000)
  const records: PlainOperation[] = []
  const effects: { at: number; apply: () => void }[] = []
  let value: unknown = null
  const write = (record: PlainOperation, at: number): void => {
    effects.push({
      at,
      apply: () => {
        value = record.value
      },
    })
  }
  for (let i = 0; i < operations; i++) {
    const client = nextFree.indexOf(Math.min(...nextFree))
    const start = Math.floor(nextFree[client])
    const length = Math.floor(100 + random() * 1900)
    nextFree[client] = start + length + random() * 50
    const isWrite = random() < 0.5
    const record: PlainOperation = {
      client: `c${client}`,
      op: isWrite ? 'write' : 'read',
      key: 'k',
      start,
      end: start + length,
    }
    records.push(record)
    const at = start + Math.floor(random() * length)
    if (!isWrite) {
      effects.push({
        at,
        apply: () => {
          record.value = value
        },
      })
      continue
    }
    record.value = `v${Math.floor(random() * values)}`
    if (random() >= unsure) {
      write(record, at)
      continue
    }
    record.outcome = 'unsure'
    if (random() < 0.5) write(record, random() < 0.3 ? at + 20_000 * random() : at)
  }
  if (planted === 'stale read') {
    const early = records.slice(0, Math.ceil(operations / 50)).filter(({ op }) => op === 'write')
    for (const record of early) {
      if (record.value !== 'v0' && record !== early[0]) continue
      record.value = 'planted'
      delete record.outcome
    }
  }
  for (const { apply } of effects.sort((a, b) => a.at - b.at)) apply()
  if (planted === 'stale read') {
    const reads = records.filter(({ op }) => op === 'read')
    reads[Math.floor(reads.length / 2)].value = 'planted'
  }
  return { operations: planted === 'turns' ? [...records, ...turns(records)] : records, clockError: 0 }
}

/**
 * Reads of v0 and v1 in turn, in the middle of the records. Between two turns of v0 something else stood there, so each
 * takes a write of v0 of its own: one turn more than there are such writes, and no order explains them.
 */
function turns(records: readonly PlainOperation[]): PlainOperation[] {
  const from = records[records.length >> 1].start
  for (let n = 1; ; n++) {
    const last = from + 8 * n
    if (inReach(records, 'v0', from, last) >= n) continue
    return Array.from({ length: 2 * n - 1 }, (_, i) => {
      const start = from + 4 * i
      return { client: 'turns', op: 'read', key: 'k', value: `v${i % 2}`, start, end: start + 2 }
    })
  }
}

/** How many writes of the value reads from `from` to `to` can see: begun by then, not certainly overwritten before. */
function inReach(records: readonly PlainOperation[], value: unknown, from: number, to: number): number {
  const before = records.filter((w) => w.op === 'write' && w.outcome !== 'unsure' && w.end! < from)
  const newest = Math.max(...before.map(({ start }) => start))
  return records.filter(
    (w) =>
      w.op === 'write' && w.value === value && w.start <= to && (w.outcome === 'unsure' || w.end! >= newest),
  ).length
}
