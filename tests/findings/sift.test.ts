import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { blameRead, sessionsOf } from '../../src/findings/register/blame.js'
import { Newer } from '../../src/findings/register/newer.js'
import { Sift } from '../../src/findings/register/sift.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { countPairs } from '../../src/order/counting.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import { findVersions } from '../../src/order/versions.js'
import { linearizable } from '../../src/promises/linearizable.js'
import { keyText, tinyKey } from '../oracles/arbitraries.js'
import { runs } from '../oracles/decide.js'

describe('the quick test before a read is judged', () => {
  it('lets through every read that is blamed, and holds back most others', async () => {
    const tally = { blamed: 0, held: 0, passed: 0 }
    await fc.assert(
      fc.asyncProperty(tinyKey('register', 9), async (tiny) => {
        const history = await readHistory([textSource('tiny', keyText(tiny))])
        const key = gatherKey(history, indexByKey(history), 0, 0n)
        const counting = countPairs(key, linearizable)
        const newer = new Newer(counting, findVersions(key))
        const sift = new Sift(newer)
        for (let read = 0; read < key.n; read++) {
          if (newer.versions.readOf[read] < 0) continue
          const passes = sift.mayBeBlamed(read)
          if (blameRead(newer, sessionsOf(key.client), read)) {
            tally.blamed++
            expect(passes, keyText(tiny)).toBe(true)
          } else if (passes) tally.passed++
          else tally.held++
        }
      }),
      { numRuns: runs(3000) },
    )
    expect(tally.blamed).toBeGreaterThan(100)
    expect(tally.held).toBeGreaterThan(2 * tally.passed)
  })
})
