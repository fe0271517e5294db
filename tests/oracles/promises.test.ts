import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { boundedStaleness } from '../../src/promises/bounded-staleness.js'
import { coherent } from '../../src/promises/coherent.js'
import { durable } from '../../src/promises/durable.js'
import { monotonicReads } from '../../src/promises/monotonic-reads.js'
import { monotonicWrites } from '../../src/promises/monotonic-writes.js'
import type { PairRule } from '../../src/promises/promise.js'
import { readYourWrites } from '../../src/promises/read-your-writes.js'
import { regular } from '../../src/promises/regular.js'
import { writesFollowReads } from '../../src/promises/writes-follow-reads.js'
import { writtenValues } from '../../src/promises/written-values.js'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import { bruteForce, type PlainRule } from './brute-force.js'
import { decide, runs } from './decide.js'

const PROMISES: [PairRule, PlainRule][] = [
  [writtenValues, { promise: 'written-values' }],
  [readYourWrites, { promise: 'read-your-writes' }],
  [monotonicReads, { promise: 'monotonic-reads' }],
  [monotonicWrites, { promise: 'monotonic-writes' }],
  [writesFollowReads, { promise: 'writes-follow-reads' }],
  [coherent, { promise: 'coherent' }],
  [boundedStaleness({ withinNs: 0n }), { promise: 'bounded-staleness', within: 0 }],
  [boundedStaleness({ withinNs: 3n }), { promise: 'bounded-staleness', within: 3 }],
  [boundedStaleness({ versions: 0 }), { promise: 'bounded-staleness', versions: 0 }],
  [boundedStaleness({ versions: 1 }), { promise: 'bounded-staleness', versions: 1 }],
  [boundedStaleness({ withinNs: 2n, versions: 1 }), { promise: 'bounded-staleness', within: 2, versions: 1 }],
  [durable(), { promise: 'durable' }],
  [durable(3n), { promise: 'durable', settle: 3 }],
  [regular, { promise: 'regular' }],
]

describe.each(['register', 'cas', 'counter'] as Family[])(
  'the deciders agree with the definition on %s keys',
  (family) => {
    it.each(PROMISES.map(([rule, plain]) => [plain, rule] as const))('of %o', async (plain, rule) => {
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
        { numRuns: runs(600) },
      )
      expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(0.05 * (tally.holds + tally.broken))
    })
  },
)
