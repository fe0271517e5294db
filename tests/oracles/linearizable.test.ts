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

  // The key may have been absent before, which is all that the cas needs.
  it('where nothing but an unsure cas tells what the key held at the start', async () => {
    const key: PlainKey = {
      operations: [
        { client: 'a', op: 'cas', key: 'k', expect: null, value: 1, start: 0, end: 1, outcome: 'unsure' },
        { client: 'b', op: 'read', key: 'k', value: 1, start: 2, end: 3 },
      ],
      clockError: 0,
      initialUnknown: true,
    }
    expect(bruteForce(key, { promise: 'linearizable' })).toBe(true)
    expect((await decide(key, linearizable)).verdict).toBe('holds')
  })
})
