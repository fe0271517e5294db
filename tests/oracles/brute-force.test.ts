import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from './arbitraries.js'
import { bruteForce, type PlainKey } from './brute-force.js'
import { witnessByDefinition } from './by-definition.js'
import { runs } from './decide.js'
import { lifelikeKey } from './lifelike.js'
import { PLAIN_RULES } from './rules.js'

const shortKey = (family: Family): fc.Arbitrary<PlainKey> =>
  fc.oneof(
    tinyKey(family, 6),
    lifelikeKey(family, { most: 6, bends: [0, 3] }).map(({ key }) => key),
  )

describe('the quick search agrees with the definition taken literally', () => {
  it.each(['register', 'cas', 'counter', 'sizes', 'ambiguous', 'mixed'] as Family[])(
    'under every promise, on random %s keys',
    (family) => {
      fc.assert(
        fc.property(shortKey(family), (key) => {
          for (const rule of PLAIN_RULES) {
            const witness = witnessByDefinition(key, rule)
            expect(bruteForce(key, rule), `${JSON.stringify(rule)}\n${keyText(key)}`).toBe(
              witness !== undefined,
            )
          }
        }),
        { numRuns: runs(400) },
      )
    },
  )
})
