import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { linearizable } from '../../src/promises/linearizable.js'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import { bruteForce, type PlainKey } from './brute-force.js'
import { decide, runs } from './decide.js'

/** Families whose keys are always decided. */
const DECIDED: Family[] = ['register', 'cas', 'counter']

describe('the deciders agree with the definition of linearizable', () => {
  it.each(DECIDED)('on random %s keys', async (family) => {
    const tally = { holds: 0, broken: 0 }
    await fc.assert(
      fc.asyncProperty(tinyKey(family), async (key) => {
        const expected = bruteForce(key, { promise: 'linearizable' }) ? 'holds' : 'broken'
        const { verdict } = await decide(key, linearizable)
        tally[expected]++
        expect(verdict, keyText(key)).toBe(expected)
      }),
      { numRuns: runs(3000) },
    )
    // A check that cannot fail is no check: both answers must be common.
    expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(0.1 * (tally.holds + tally.broken))
  })

  it.each(['sizes', 'ambiguous', 'mixed'] as Family[])(
    'or does not decide, on random %s keys',
    async (family) => {
      await fc.assert(
        fc.asyncProperty(tinyKey(family), async (key) => {
          const { verdict } = await decide(key, linearizable)
          if (verdict === 'undecided') return
          expect(verdict, keyText(key)).toBe(
            bruteForce(key, { promise: 'linearizable' }) ? 'holds' : 'broken',
          )
        }),
        { numRuns: runs(1000) },
      )
    },
  )

  // Cases that random keys meet too seldom.
  const RARE: { name: string; key: PlainKey; expected: 'holds' | 'broken' }[] = [
    {
      // It may have been absent before, which is all that the cas needs.
      name: 'where nothing but an unsure cas tells what the key held at the start',
      expected: 'holds',
      key: {
        operations: [
          { client: 'a', op: 'cas', key: 'k', expect: null, value: 1, start: 0, end: 1, outcome: 'unsure' },
          { client: 'b', op: 'read', key: 'k', value: 1, start: 2, end: 3 },
        ],
        clockError: 0,
        initialUnknown: true,
      },
    },
    {
      name: 'where that cas expected what only a refused write offered',
      expected: 'broken',
      key: {
        operations: [
          { client: 'c', op: 'write', key: 'k', value: 5, start: 0, end: 1, outcome: 'refused' },
          { client: 'a', op: 'cas', key: 'k', expect: 5, value: 6, start: 0, end: 1, outcome: 'unsure' },
          { client: 'b', op: 'read', key: 'k', value: 6, start: 2, end: 3 },
        ],
        clockError: 0,
        initialUnknown: true,
      },
    },
    {
      // The read precedes the unsure increment on their host; nothing follows for what its client did elsewhere.
      name: 'where pairs would differ if they were closed over an unsure operation',
      expected: 'holds',
      key: {
        operations: [
          { client: 'b', op: 'read', key: 'k', value: 1, start: 10, end: 11, host: 'h' },
          { client: 'a', op: 'increment', key: 'k', start: 12, end: 12, host: 'h', outcome: 'unsure' },
          { client: 'a', op: 'increment', key: 'k', start: 13, end: 14, host: 'i' },
        ],
        clockError: 5,
      },
    },
  ]
  it.each(RARE)('$name: $expected', async ({ key, expected }) => {
    expect(bruteForce(key, { promise: 'linearizable' })).toBe(expected === 'holds')
    expect((await decide(key, linearizable)).verdict).toBe(expected)
  })
})
