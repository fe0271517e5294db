import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { Purse } from '../../src/deciders/search/budget.js'
import { searchThrough } from '../../src/deciders/search/search.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { countPairs } from '../../src/order/counting.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { bruteForce } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { PLAIN_RULES, programRule } from '../oracles/rules.js'

describe.each(['register', 'cas', 'ambiguous', 'counter', 'sizes', 'mixed'] as Family[])(
  'the search agrees with the definition on %s keys',
  (family) => {
    it.each(PLAIN_RULES)('of %o', async (plain) => {
      const rule = programRule(plain)
      const tally = { holds: 0, broken: 0 }
      await fc.assert(
        fc.asyncProperty(tinyKey(family), async (key) => {
          if (plain.versions !== undefined && key.operations.some(({ op }) => op === 'increment')) return
          const expected = bruteForce(key, plain) ? 'holds' : 'broken'
          tally[expected]++
          const history = await readHistory([textSource('tiny', keyText(key))])
          const gathered = gatherKey(history, indexByKey(history), 0, history.clockErrorNs)
          const outcome = searchThrough(countPairs(gathered, rule), history.values, new Purse({ steps: 1e6 }))
          expect(outcome.found === 'order' ? 'holds' : 'broken', keyText(key)).toBe(expected)
        }),
        { numRuns: runs(300) },
      )
    })
  },
)
