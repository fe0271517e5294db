/** Verdicts go by exact nanoseconds, however large: every time multiplied and moved, and durations a nanosecond off. */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { decideKey } from '../../src/deciders/decide-key.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import { parsePromise } from '../../src/promises/parse-request.js'
import type { PairRule } from '../../src/promises/promise.js'
import { type Family, keyText } from '../oracles/arbitraries.js'
import type { PlainKey } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { lifelikeKey } from '../oracles/lifelike.js'

/** The key with every time t at base + t·k ns, its clock error at k times as much. */
function stretched(key: PlainKey, k: bigint, base: bigint): string {
  const header = JSON.stringify({
    history: 1,
    ...(key.initial === undefined ? {} : { initial: { k: key.initial } }),
    ...(key.initialUnknown ? { initialUnknown: true } : {}),
  })
  const lines = key.operations.map(({ start, end, ...rest }) => {
    const at = (t: number): string => String(base + BigInt(t) * k)
    const times = `"start":${at(start)}${end === undefined ? '' : `,"end":${at(end)}`}`
    return `${JSON.stringify(rest).slice(0, -1)},${times}}`
  })
  const clockError = BigInt(key.clockError) * k
  return `${[`${header.slice(0, -1)},"clockError":${clockError}}`, ...lines].join('\n')}\n`
}

async function verdicts(text: string, rules: readonly PairRule[]): Promise<string[]> {
  const history = await readHistory([textSource('f', text)])
  const key = gatherKey(history, indexByKey(history), 0, history.clockErrorNs)
  return rules.map((rule) => decideKey(key, history.values, rule).verdict)
}

const rule = (typed: string): PairRule => parsePromise(typed).rule!

const TIMELESS = ['linearizable', 'regular', 'coherent', 'durable', 'read-your-writes', 'written-values'].map(
  rule,
)
const someKey = fc
  .constantFrom<Family>('register', 'cas', 'counter')
  .chain((family) => lifelikeKey(family, { least: 2, most: 10, bends: [0, 3] }))
  .map(({ key }) => key)

describe('verdicts go by exact nanoseconds', () => {
  it.each([
    ['by an odd number', 1_000_003n, 0n],
    ['to days, near the present', 2n ** 43n + 1n, 1_719_830_000_123_456_789n],
    ['to what a double just holds', 2n ** 47n - 1n, -(2n ** 52n)],
    ['to where a wait, and not the times, is too long for a double', 2n ** 48n + 1n, 0n],
    ['past what a double holds', 2n ** 50n + 1n, 7n],
    ['to all that the format allows', 2n ** 55n - 1n, -(2n ** 61n) + 1n],
  ])('when all times are stretched %s', async (_, k, base) => {
    await fc.assert(
      fc.asyncProperty(
        someKey,
        fc.oneof(fc.integer({ min: 1, max: 4 }), fc.integer({ min: 16, max: 24 })),
        async (key, wait) => {
          const plain = [wait, wait - 1].flatMap((w) => [
            rule(`bounded-staleness within=${w}ns`),
            rule(`durable settle=${w}ns`),
          ])
          const long = BigInt(wait) * k
          const expected = await verdicts(keyText(key), [
            ...TIMELESS,
            ...plain,
            rule(`durable settle=${wait}ns`),
          ])
          // Differences are multiples of k: a nanosecond more or less than one falls between two of them.
          const actual = await verdicts(stretched(key, k, base), [
            ...TIMELESS,
            rule(`bounded-staleness within=${long + 1n}ns`),
            rule(`durable settle=${long - 1n}ns`),
            rule(`bounded-staleness within=${long - 1n}ns`),
            rule(`durable settle=${long - k}ns`),
            rule(`durable settle=${long}ns`),
          ])
          expect(actual, `${wait}\n${keyText(key)}`).toEqual(expected)
        },
      ),
      { numRuns: runs(200) },
    )
  })
})
