import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import type { PlainKey, PlainRule } from './brute-force.js'
import { decideAll, runs } from './decide.js'
import { lifelikeKey } from './lifelike.js'
import { countedPairs, precedes, type Role, readKey } from './plain-pairs.js'
import { PLAIN_RULES, programRule } from './rules.js'

/** What puts a promise to the test: a pair of this kind that it counts (a read at all, where it counts none). */
const TESTED_BY: Record<string, readonly [Role, Role] | undefined> = {
  'written-values': undefined,
  'monotonic-writes': undefined,
  'monotonic-reads': ['read', 'read'],
  'writes-follow-reads': ['read', 'write'],
}

/** Whether nothing on the key tests the promise, by looking at every pair. */
function isUntestedByPairs(key: PlainKey, rule: PlainRule): boolean {
  const { all, kind } = readKey(key)
  const live = all.filter((op) => op.acked || (op.outcome === 'unsure' && op.op !== 'read'))
  const roles = rule.promise in TESTED_BY ? TESTED_BY[rule.promise] : (['write', 'read'] as const)
  if (roles === undefined) return !live.some(({ reads }) => reads)
  // That a read of a counter comes before increments that it precedes holds under every promise: no promise adds it.
  const pairs = countedPairs(key, rule, kind, all)
  const counted: typeof pairs = (a, ra, b, rb) =>
    pairs(a, ra, b, rb) && (rule.promise !== 'writes-follow-reads' || a.client === b.client)
  const [ra, rb] = roles
  return !live.some(
    (a) =>
      (ra === 'read' ? a.reads : a.writes) &&
      live.some(
        (b) =>
          (rb === 'read' ? b.reads : b.writes) &&
          (counted(a, ra, b, rb) || (rule.versions !== undefined && precedes(key, a, b))),
      ),
  )
}

describe('a key that holds is called untested exactly where no pair tests the promise', () => {
  it.each(['register', 'cas', 'counter'] as Family[])('on %s keys', async (family) => {
    const tally = { tested: 0, untested: 0 }
    const someKey = fc.oneof(
      tinyKey(family, 4),
      lifelikeKey(family, { most: 6, bends: [0, 1] }).map(({ key }) => key),
    )
    await fc.assert(
      fc.asyncProperty(someKey, async (key) => {
        const decisions = await decideAll(
          key,
          PLAIN_RULES.map((rule) => programRule(rule)),
        )
        PLAIN_RULES.forEach((rule, i) => {
          const decision = decisions[i]
          if (decision.verdict !== 'holds') return
          const expected = isUntestedByPairs(key, rule)
          tally[expected ? 'untested' : 'tested']++
          expect(decision.untested, `${JSON.stringify(rule)}\n${keyText(key)}`).toBe(expected)
        })
      }),
      { numRuns: runs(300) },
    )
    expect(Math.min(tally.tested, tally.untested)).toBeGreaterThan(0.15 * (tally.tested + tally.untested))
  })
})
