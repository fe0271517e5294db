import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { parsePromise } from '../../src/promises/parse-request.js'
import { type Family, keyText } from './arbitraries.js'
import { bruteForce } from './brute-force.js'
import { decideAll, runs } from './decide.js'
import { lifelikeKey } from './lifelike.js'
import { PLAIN_RULES, programRule } from './rules.js'

const FAMILIES: Family[] = ['register', 'cas', 'counter', 'sizes', 'ambiguous', 'mixed']
/** Families whose keys are always decided. */
const DECIDED: Family[] = ['register', 'cas', 'counter']

/** Enough that a good part of the keys is broken: repeated values explain a lot away. */
const BENDS: Record<Family, [number, number]> = {
  register: [1, 4],
  cas: [1, 4],
  counter: [0, 3],
  sizes: [0, 3],
  ambiguous: [3, 5],
  mixed: [0, 3],
}

const RULES = PLAIN_RULES.map((plain) => ({ plain, rule: programRule(plain) }))

describe('keys that a sound store could have recorded', () => {
  it.each(FAMILIES)('hold by definition: short %s keys', async (family) => {
    await fc.assert(
      fc.asyncProperty(lifelikeKey(family, { most: 8, bends: [0, 0] }), async ({ key }) => {
        for (const { plain } of RULES)
          expect(bruteForce(key, plain), `${JSON.stringify(plain)}\n${keyText(key)}`).toBe(true)
      }),
      { numRuns: runs(150) },
    )
  })

  it.each(FAMILIES)('are never called broken: long %s keys', async (family) => {
    await fc.assert(
      fc.asyncProperty(lifelikeKey(family, { least: 60, most: 160, bends: [0, 0] }), async ({ key }) => {
        const rules = [...RULES.map(({ rule }) => rule), parsePromise('no-lost-updates').rule!]
        const verdicts = await decideAll(key, rules)
        const allowed = DECIDED.includes(family) ? ['holds', 'left-out'] : ['holds', 'undecided', 'left-out']
        verdicts.forEach(({ verdict }, i) => {
          expect(allowed, `${verdict} ${JSON.stringify(rules[i].name)}\n${keyText(key)}`).toContain(verdict)
        })
      }),
      { numRuns: runs(40) },
    )
  })
})

describe('keys that are true but for a bend or two: the deciders agree with the definition', () => {
  it.each(FAMILIES)('of every promise, on %s keys', async (family) => {
    const tally = { holds: 0, broken: 0 }
    await fc.assert(
      fc.asyncProperty(lifelikeKey(family, { least: 3, most: 9, bends: BENDS[family] }), async ({ key }) => {
        const verdicts = await decideAll(
          key,
          RULES.map(({ rule }) => rule),
        )
        RULES.forEach(({ plain }, i) => {
          const { verdict } = verdicts[i]
          if (verdict === 'left-out') return
          const expected = bruteForce(key, plain) ? 'holds' : 'broken'
          if (plain.promise === 'linearizable') tally[expected]++
          if (verdict === 'undecided' && !DECIDED.includes(family)) return
          expect(verdict, `${JSON.stringify(plain)}\n${keyText(key)}`).toBe(expected)
        })
      }),
      { numRuns: runs(500) },
    )
    // A check that cannot fail is no check: both answers must be common.
    expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(0.15 * (tally.holds + tally.broken))
  })
})
