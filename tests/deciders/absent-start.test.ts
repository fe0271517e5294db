/** Under an unknown start absence may have been there before, whatever a delete writes later. */
import { describe, expect, it } from 'vitest'
import { linearizable } from '../../src/promises/linearizable.js'
import { writtenValues } from '../../src/promises/written-values.js'
import { bruteForce, type PlainOperation } from '../oracles/brute-force.js'
import { decide } from '../oracles/decide.js'

const at = (i: number) => ({ client: 'a', key: 'k', start: 10 * i, end: 10 * i + 5 })
const read = (i: number, value: unknown): PlainOperation => ({ ...at(i), op: 'read', value })
const write = (i: number, value: unknown): PlainOperation => ({ ...at(i), op: 'write', value })
const remove = (i: number): PlainOperation => ({ ...at(i), op: 'delete' })
const cas = (i: number, expected: unknown, value: unknown): PlainOperation => ({
  ...at(i),
  op: 'cas',
  expect: expected,
  value,
})

describe('a key whose start is not known', () => {
  it.each<[string, PlainOperation[]]>([
    ['read as absent, written, deleted', [read(0, null), write(1, 1), remove(2)]],
    ['taken by a cas from absence, deleted', [cas(0, null, 1), remove(1)]],
  ])('%s, is not accused', async (_, operations) => {
    const key = { operations, clockError: 0, initialUnknown: true }
    for (const [rule, promise] of [
      [linearizable, 'linearizable'],
      [writtenValues, 'written-values'],
    ] as const) {
      expect(bruteForce(key, { promise })).toBe(true)
      expect((await decide(key, rule)).verdict).toBe('holds')
    }
  })

  it('is broken where no start explains it', async () => {
    const operations = [read(0, null), write(1, 1), write(2, 2), read(3, 1), remove(4)]
    const key = { operations, clockError: 0, initialUnknown: true }
    expect(bruteForce(key, { promise: 'linearizable' })).toBe(false)
    expect((await decide(key, linearizable)).verdict).toBe('broken')
  })

  it('is decided where a read tells the start, or every read of absence follows the delete', async () => {
    const told = {
      operations: [read(0, 'old'), remove(1), read(2, null)],
      clockError: 0,
      initialUnknown: true,
    }
    expect((await decide(told, linearizable)).verdict).toBe('holds')
    const after = { operations: [write(0, 1), remove(1), read(2, null)], clockError: 0, initialUnknown: true }
    expect((await decide(after, linearizable)).verdict).toBe('holds')
  })
})
