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
  /** one client sees a value that was only ever written long before, and was overwritten */
  readonly planted?: boolean
  /** a client more that reads two values in turn, so often: more than unsure writes can explain */
  readonly flips?: number
  readonly seed: number
}

/** A register that is truly linearizable, but for what is planted. Requests take 100 to 2,000 time units. */
export function makeHardKey({
  operations,
  clients,
  values,
  unsure,
  planted,
  flips = 0,
  seed,
}: HardKey): PlainKey {
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
  if (planted) {
    // Written once at the very start, long overwritten when it is read again.
    const first = records.findIndex(({ op }) => op === 'write')
    records[first].value = 'planted'
    delete records[first].outcome
  }
  for (const { apply } of effects.sort((a, b) => a.at - b.at)) apply()
  if (planted) {
    const reads = records.filter(({ op }) => op === 'read')
    reads[Math.floor(reads.length / 2)].value = 'planted'
  }
  const middle = records[operations >> 1].start
  for (let i = 0; i < flips; i++) {
    const start = middle + 4 * i
    records.push({ client: 'flips', op: 'read', key: 'k', value: `v${i % 2}`, start, end: start + 2 })
  }
  return { operations: records, clockError: 0 }
}
