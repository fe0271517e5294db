import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { parseCount, parseTimestamp } from '../../src/adapters/instants.js'

const exactly = (ns: bigint): { floor: bigint; ceil: bigint } => ({ floor: ns, ceil: ns })

describe('timestamps by RFC 3339', () => {
  // RFC 3339, section 5.8, examples; their counts of seconds by GNU date.
  it.each([
    ['1985-04-12T23:20:50.52Z', 482_196_050_520_000_000n],
    ['1996-12-19T16:39:57-08:00', 851_042_397_000_000_000n],
    ['1937-01-01T12:00:27.87+00:20', -1_041_337_172_130_000_000n],
  ])('reads %s', (text, ns) => {
    expect(parseTimestamp(text)).toEqual(exactly(ns))
  })

  it.each([
    ['1990-12-31T23:59:60Z', 'a second of 00 to 59'],
    ['2024-07-01T20:00:00', 'an offset from UTC at its end, Z or +02:00'],
    ['2023-02-29T00:00:00Z', 'a day and a time of day that exist'],
    ['2024-07-01T24:00:00Z', 'a day and a time of day that exist'],
    ['2024-07-01T23:00:00+24:00', 'a day and a time of day that exist'],
    ['1719864000', 'a timestamp such as 2024-07-01T20:00:00.123456789Z'],
    ['2024-07-01', 'a timestamp such as 2024-07-01T20:00:00.123456789Z'],
  ])('refuses %s', (text, expected) => {
    expect(() => parseTimestamp(text)).toThrow(expected)
  })

  it('keeps nanoseconds, and bounds what is finer from both sides', () => {
    expect(parseTimestamp('2024-02-29T00:00:00.123456789Z')).toEqual(exactly(1_709_164_800_123_456_789n))
    expect(parseTimestamp('2024-02-29 00:00:00,1234567890+0000')).toEqual(exactly(1_709_164_800_123_456_789n))
    expect(parseTimestamp('1970-01-01T00:00:00.0000000001Z')).toEqual({ floor: 0n, ceil: 1n })
  })

  it('agrees with the language’s own reader to the millisecond, at any offset', () => {
    const min = new Date('1700-01-01T00:00:00Z')
    const max = new Date('2250-01-01T00:00:00Z')
    const date = fc.date({ min, max, noInvalidDate: true })
    fc.assert(
      fc.property(date, fc.integer({ min: -1439, max: 1439 }), (date, offset) => {
        const local = new Date(date.getTime() + offset * 60_000).toISOString().slice(0, -1)
        const [hours, minutes] = [Math.floor(Math.abs(offset) / 60), Math.abs(offset) % 60]
        const two = (n: number): string => String(n).padStart(2, '0')
        const text = `${local}${offset < 0 ? '-' : '+'}${two(hours)}:${two(minutes)}`
        expect(parseTimestamp(text)).toEqual(exactly(BigInt(Date.parse(text)) * 1_000_000n))
      }),
    )
  })
})

describe('counts of a unit', () => {
  it.each([
    ['1719830000.123456789', 's', 1_719_830_000_123_456_789n],
    ['1.719830000123456789e18', 'ns', 1_719_830_000_123_456_789n],
    ['-0.5', 'us', -500n],
    ['0', 'ms', 0n],
  ] as const)('reads %s %s', (text, unit, ns) => {
    expect(parseCount(text, unit)).toEqual(exactly(ns))
  })

  it('bounds what is finer than a nanosecond from both sides', () => {
    expect(parseCount('1.5', 'ns')).toEqual({ floor: 1n, ceil: 2n })
    expect(parseCount('-1.5', 'ns')).toEqual({ floor: -2n, ceil: -1n })
    expect(parseCount('0.30000000000000004', 's')).toEqual({ floor: 300_000_000n, ceil: 300_000_001n })
    expect(parseCount('1e-400', 's')).toEqual({ floor: 0n, ceil: 1n })
    expect(parseCount('-1e-400', 's')).toEqual({ floor: -1n, ceil: 0n })
  })

  it.each(['1,5', '+1', ' 1', '0x10', '', 'NaN', '2024-07-01T20:00:00Z'])('refuses %j', (text) => {
    expect(() => parseCount(text, 's')).toThrow('a number of s')
  })

  it('bounds every decimal between neighbouring whole numbers', () => {
    fc.assert(
      fc.property(fc.bigInt(-(10n ** 20n), 10n ** 20n), fc.integer({ min: 0, max: 25 }), (digits, places) => {
        const { floor, ceil } = parseCount(`${digits}e-${places}`, 'ns')
        const scale = 10n ** BigInt(places)
        expect(floor * scale <= digits && digits <= ceil * scale).toBe(true)
        expect(ceil - floor).toBe(digits % scale === 0n ? 0n : 1n)
      }),
    )
  })
})
