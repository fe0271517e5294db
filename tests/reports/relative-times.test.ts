import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { relativeTimes } from '../../src/reports/relative-times.js'

describe('times relative to the first', () => {
  it('no time gives no text, one time is the origin', () => {
    expect(relativeTimes([])).toEqual([])
    expect(relativeTimes([1719830000123456789n])).toEqual(['+0 ns'])
  })

  it('share one unit, with as many decimals as tell them apart', () => {
    expect(relativeTimes([5n, 9_638_005n, 9_819_005n])).toEqual(['+0.0 ms', '+9.6 ms', '+9.8 ms'])
    expect(relativeTimes([0n, 1_000_000_000n, 1_000_000_001n])).toEqual([
      '+0.000000000 s',
      '+1.000000000 s',
      '+1.000000001 s',
    ])
  })

  it('count from the earliest, wherever it stands', () => {
    expect(relativeTimes([-2n, -7n])).toEqual(['+5 ns', '+0 ns'])
  })

  it('differ exactly where the times differ, and are never off by more than the last decimal', () => {
    fc.assert(
      fc.property(
        fc.array(fc.bigInt(-(2n ** 63n), 2n ** 63n - 1n), { minLength: 1, maxLength: 6 }),
        (times) => {
          const texts = relativeTimes(times)
          expect(new Set(texts).size).toBe(new Set(times).size)
          const first = times.reduce((a, b) => (b < a ? b : a))
          for (const [at, text] of texts.entries()) {
            const [, whole, fraction = '', unit] = /^\+(\d+)(?:\.(\d+))? (s|ms|us|ns)$/.exec(text)!
            const scale = { s: 9, ms: 6, us: 3, ns: 0 }[unit]!
            const told = BigInt(whole + fraction) * 10n ** BigInt(scale - fraction.length)
            const off = told - (times[at] - first)
            expect(2n * (off < 0n ? -off : off)).toBeLessThanOrEqual(10n ** BigInt(scale - fraction.length))
          }
        },
      ),
    )
  })
})
