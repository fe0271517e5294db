/** Freshness of tiny random keys by definition, of times that no double holds, and of stores whose staleness is known. */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { sumUp } from '../../src/freshness/figures.js'
import { measureFreshness } from '../../src/freshness/measure.js'
import { type Samples, takeSamples } from '../../src/freshness/samples.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { indexByKey } from '../../src/order/key-history.js'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { runs } from '../oracles/decide.js'
import { seededRandom } from '../oracles/random.js'
import { DELAYS, QUORUMS } from '../published/pbs.js'
import { freshnessByDefinition } from './by-definition.js'

async function samplesOf(text: string): Promise<Samples> {
  const history = await readHistory([textSource('tiny', text)])
  return takeSamples(history, indexByKey(history), history.clockErrorNs, () => true)
}

function rowsOf(samples: Samples) {
  return Array.from({ length: samples.count }, (_, i) => ({
    at: samples.operation[i],
    lag: samples.isAfterWrite[i] ? Number(samples.ageNs[i]) : undefined,
    staleness: Number(samples.staleNs[i]),
    versions: samples.behind[i],
  })).sort((a, b) => a.at - b.at)
}

describe('freshness of each read', () => {
  it.each<[Family, number]>([
    ['register', 12],
    ['register', 40],
    ['cas', 12],
    ['cas', 30],
    ['ambiguous', 12],
    ['counter', 8],
    ['mixed', 8],
  ])(
    'is what the definition says on random keys (%s, up to %i operations)',
    async (family, size) => {
      let stale = 0
      await fc.assert(
        fc.asyncProperty(tinyKey(family, size), async (random) => {
          const key = { ...random, initialUnknown: false }
          const expected = freshnessByDefinition(key)
          expect(rowsOf(await samplesOf(keyText(key)))).toEqual(expected.reads)
          stale += expected.reads.filter(({ versions }) => versions > 0).length
        }),
        { numRuns: runs(1000) },
      )
      if (family === 'register' || family === 'cas') expect(stale).toBeGreaterThan(100)
    },
    60_000,
  )

  it('is the same where times do not fit a double', async () => {
    const far = 4_000_000_000_000_000_000n
    await fc.assert(
      fc.asyncProperty(tinyKey('register', 12), async (random) => {
        const near = keyText({ ...random, initialUnknown: false })
        const shifted = near.replace(/"(start|end)":(\d+)/g, (_, name, t) => `"${name}":${far + BigInt(t)}`)
        // An operation on another key, a century before, makes all times 64-bit.
        const other = '{"client":"z","op":"write","key":"z","value":1,"start":0,"end":1}\n'
        const wide = await samplesOf(shifted + other)
        expect(wide.ageNs).toBeInstanceOf(BigUint64Array)
        expect(rowsOf(wide)).toEqual(rowsOf(await samplesOf(near)))
      }),
      { numRuns: runs(300) },
    )
  })

  it('is exact past 2^53 nanoseconds', async () => {
    const history = await readHistory([
      textSource(
        'f',
        [
          '{"client":"w","op":"write","key":"k","value":1,"start":1,"end":2}',
          '{"client":"w","op":"write","key":"k","value":2,"start":3,"end":4}',
          '{"client":"r","op":"read","key":"k","value":1,"start":9007199254740999,"end":9007199254741000}',
          '',
        ].join('\n'),
      ),
    ])
    expect(measureFreshness(history).groups[0].staleNs?.most).toBe('9007199254740995')
  })
})

/** Reads at one time after the write, so many versions behind. */
function madeUp(behind: readonly number[]): Samples {
  const n = behind.length
  return {
    count: n,
    operation: Int32Array.from(behind.keys()),
    isAfterWrite: new Uint8Array(n).fill(1),
    ageNs: new Float64Array(n).fill(5),
    staleNs: Float64Array.from(behind, (versions) => (versions > 0 ? 5 : 0)),
    behind: Int32Array.from(behind),
    isStale: Uint8Array.from(behind, (versions) => (versions > 0 ? 1 : 0)),
    leftOut: { counters: 0, ambiguous: 0, wrong: 0 },
  }
}

/** Eight standard deviations of a share. */
const slack = (share: number, n: number): number => 8 * Math.sqrt((share * (1 - share)) / n) + 1e-9

describe('known staleness', () => {
  it.each(QUORUMS.filter(({ within }) => within.size > 0))(
    'of a history over quorums n $n, r $r, w $w',
    async ({ n, r, w, misses, within }) => {
      const random = seededRandom(7)
      const ROUNDS = 6000
      const some = (size: number): number[] => {
        const left = Array.from({ length: n }, (_, i) => i)
        return Array.from({ length: size }, () => left.splice(Math.floor(random() * left.length), 1)[0])
      }
      // Each write reaches its quorum and no other replica; each read returns the newest that its quorum has.
      const replicas = new Int32Array(n)
      const lines: string[] = ['{"history":1,"initial":{"k":0}}']
      for (let version = 1; version <= ROUNDS; version++) {
        const t = version * 10
        for (const replica of some(w)) replicas[replica] = version
        const value = Math.max(...some(r).map((replica) => replicas[replica]))
        lines.push(
          JSON.stringify({ client: 'a', op: 'write', key: 'k', value: version, start: t, end: t + 2 }),
        )
        lines.push(JSON.stringify({ client: 'b', op: 'read', key: 'k', value, start: t + 5, end: t + 6 }))
      }
      const samples = await samplesOf(`${lines.join('\n')}\n`)
      const { reads, stale, curve } = sumUp(
        'all',
        samples,
        Int32Array.from({ length: samples.count }, (_, i) => i),
      )
      expect(reads).toBe(ROUNDS)
      expect(Math.abs(stale / ROUNDS - misses)).toBeLessThan(slack(misses, ROUNDS))
      expect(curve[0].share).toBe((ROUNDS - stale) / ROUNDS)
      for (const [k, share] of within) {
        const inside = samples.behind.filter((versions) => versions < k).length / ROUNDS
        // Reads close together share writes, so the shares scatter more than independent reads would.
        expect(Math.abs(inside - share)).toBeLessThan(2 * slack(share, ROUNDS) + 2e-3)
      }
    },
  )

  it.each(DELAYS)(
    'of write delays of mean $meanWriteMs ms, $afterMs ms after',
    ({ meanWriteMs, afterMs, again }) => {
      const random = seededRandom(11)
      const READS = 40_000
      const delay = (mean: number): number => -mean * Math.log(1 - random())
      const behind = Array.from({ length: READS }, () => {
        const arrives = [0, 1, 2].map(() => delay(meanWriteMs))
        const committed = Math.min(...arrives.map((at) => at + delay(1)))
        // The replica that answers first, and when it was asked there.
        const answers = arrives.map((at) => {
          const asked = delay(1)
          return { asked, back: asked + delay(1), at }
        })
        const first = answers.reduce((a, b) => (b.back < a.back ? b : a))
        return committed + afterMs + first.asked >= first.at ? 0 : 1
      })
      const { curve } = sumUp('all', madeUp(behind), Int32Array.from(behind.keys()))
      expect(Math.abs(curve[0].share - again)).toBeLessThan(0.003 + slack(again, READS))
    },
  )
})
