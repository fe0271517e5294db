import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { rewriteTimes } from '../../src/history/rewrite-times.js'
import { runs } from '../oracles/decide.js'

const UNITS = [1n, 1_000n, 1_000_000n, 1_000_000_000n]

/** A time that every unit can write: whole nanoseconds, and its text in a unit. */
const time = fc
  .record({
    ns: fc.bigInt({ min: -(2n ** 63n), max: 2n ** 63n - 1n }),
    quoted: fc.boolean(),
    exponent: fc.boolean(),
  })
  .map(({ ns, quoted, exponent }) => ({
    ns,
    inUnit: (unit: bigint): string => {
      const places = unit.toString().length - 1
      const size = ns < 0n ? -ns : ns
      const text = exponent
        ? `${size}e-${places}`
        : `${size / unit}${places === 0 ? '' : `.${(size % unit).toString().padStart(places, '0')}`}`
      return `${quoted ? '"' : ''}${ns < 0n ? '-' : ''}${text}${quoted ? '"' : ''}`
    },
  }))

describe('rewriting the times of a record', () => {
  it('puts exact nanoseconds in their place and leaves every other character', () => {
    const piece = fc.constantFrom(
      ' ',
      '',
      ' "x" : {"start":1.5, "end":[2]} ,',
      '"título\\u00e9" : "ü€😀",',
      '"value":1.50,',
    )
    fc.assert(
      fc.property(
        fc.constantFrom(...UNITS),
        time,
        time,
        fc.tuple(piece, piece),
        fc.boolean(),
        (unit, a, b, [before, between], endFirst) => {
          const record = (first: string, second: string): string =>
            `{${before.trim()}"${endFirst ? 'end' : 'start'}" :${first} ,${before === between ? '' : between.trim()}"${endFirst ? 'start' : 'end'}":${second},"op":"delete"}`
          expect(rewriteTimes(record(a.inUnit(unit), b.inUnit(unit)), unit)).toBe(
            record(`${a.ns}`, `${b.ns}`),
          )
        },
      ),
      { numRuns: runs(500) },
    )
  })

  it('leaves an end that never came', () => {
    expect(rewriteTimes('{"start":1.5,"end":null,"op":"read"}', 1_000n)).toBe(
      '{"start":1500,"end":null,"op":"read"}',
    )
    expect(rewriteTimes('{"id":"x","end":"2e0"}', 1_000_000_000n)).toBe('{"id":"x","end":2000000000}')
  })
})
