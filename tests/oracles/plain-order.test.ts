import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import { bruteForce } from './brute-force.js'
import { decideAll, runs } from './decide.js'
import { lifelikeKey } from './lifelike.js'
import { holdsByOrder } from './plain-order.js'
import { PLAIN_RULES, programRule } from './rules.js'

const FAMILIES: Family[] = ['register', 'cas']

describe.each(FAMILIES)('ordering the versions of %s keys by looking at every pair', (family) => {
  it('agrees with the definition on short keys', () => {
    const short = fc.oneof(
      tinyKey(family),
      lifelikeKey(family, { most: 8, bends: [0, 3] }).map(({ key }) => key),
    )
    let undecided = 0
    fc.assert(
      fc.property(short, (key) => {
        for (const rule of PLAIN_RULES) {
          const holds = holdsByOrder(key, rule)
          if (holds === undefined) undecided++
          else expect(holds, `${JSON.stringify(rule)}\n${keyText(key)}`).toBe(bruteForce(key, rule))
        }
      }),
      { numRuns: runs(300) },
    )
    expect(undecided).toBeLessThan(0.05 * PLAIN_RULES.length * runs(300))
  })

  it('agrees with the decider on long ones, true but for a bend or two', async () => {
    const tally = { holds: 0, broken: 0 }
    await fc.assert(
      fc.asyncProperty(lifelikeKey(family, { least: 20, most: 90, bends: [0, 2] }), async ({ key }) => {
        const verdicts = await decideAll(
          key,
          PLAIN_RULES.map((rule) => programRule(rule)),
        )
        PLAIN_RULES.forEach((rule, i) => {
          const holds = holdsByOrder(key, rule)
          if (holds === undefined) return
          const expected = holds ? 'holds' : 'broken'
          if (rule.promise === 'regular') tally[expected]++
          expect(verdicts[i].verdict, `${JSON.stringify(rule)}\n${keyText(key)}`).toBe(expected)
        })
      }),
      { numRuns: runs(60) },
    )
    expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(0.15 * (tally.holds + tally.broken))
  })
})
