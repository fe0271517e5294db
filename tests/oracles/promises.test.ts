import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import { bruteForce } from './brute-force.js'
import { decide, runs } from './decide.js'
import { PLAIN_RULES, programRule } from './rules.js'

const PROMISES = PLAIN_RULES.filter(({ promise }) => promise !== 'linearizable')

describe.each(['register', 'cas', 'ambiguous', 'counter', 'sizes', 'mixed'] as Family[])(
  'the deciders agree with the definition on %s keys',
  (family) => {
    it.each(PROMISES)('of %o', async (plain) => {
      const rule = programRule(plain)
      const tally = { holds: 0, broken: 0 }
      await fc.assert(
        fc.asyncProperty(tinyKey(family), async (key) => {
          const expected = bruteForce(key, plain) ? 'holds' : 'broken'
          tally[expected]++
          const { verdict } = await decide(key, rule)
          if (plain.versions !== undefined && key.operations.some(({ op }) => op === 'increment')) {
            expect(verdict).toBe('left-out')
            return
          }
          expect(verdict, keyText(key)).toBe(expected)
        }),
        { numRuns: runs(400) },
      )
      expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(0.05 * (tally.holds + tally.broken))
    })
  },
)
