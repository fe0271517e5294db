import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { canonicalNumber, parseDecimal, toInteger } from '../../src/history/decimal.js'
import { runs } from '../oracles/decide.js'

/** A JSON number from a few digits, so that equal ones are met in many spellings. */
const number = fc
  .record({
    sign: fc.constantFrom('', '-'),
    whole: fc.constantFrom('0', '1', '10', '100', '12', '120', '1000000000000000000000000000000000000000000'),
    fraction: fc.constantFrom(
      '',
      '.0',
      '.00',
      '.1',
      '.10',
      '.01',
      '.2',
      '.000000000000000000000000000000000000000000001',
    ),
    exponent: fc.constantFrom(
      '',
      'e0',
      'E+1',
      'e-1',
      'e2',
      'e-02',
      'e42',
      'e-42',
      'e+00000000000000000000003',
    ),
  })
  .map(({ sign, whole, fraction, exponent }) => sign + whole + fraction + exponent)

/** Two numbers, often one in two spellings: its digits without a point, some zeros after them. */
const pair = fc.oneof(
  fc.tuple(number, number),
  fc.tuple(number, fc.nat(50)).map(([text, zeros]): [string, string] => {
    const [, sign, whole, fraction = '', exponent = '0'] =
      /^(-?)([0-9]+)(?:\.([0-9]+))?(?:e([-+0-9]+))?$/i.exec(text)!
    const digits = (whole + fraction + '0'.repeat(zeros)).replace(/^0+(?=[0-9])/, '')
    return [text, `${sign}${digits}e${Number(exponent) - fraction.length - zeros}`]
  }),
)

/** The number as a fraction of whole numbers, by the rules of the notation alone. */
function ratio(text: string): { over: bigint; under: bigint } {
  const [mantissa, exponent = '0'] = text.toLowerCase().split('e')
  const [whole, fraction = ''] = mantissa.split('.')
  const power = Number(exponent) - fraction.length
  const over = BigInt(whole + fraction)
  return power >= 0
    ? { over: over * 10n ** BigInt(power), under: 1n }
    : { over, under: 10n ** BigInt(-power) }
}

describe('decimal numbers', () => {
  it('have one canonical spelling exactly when they are equal, and it is a JSON number of the same value', () => {
    let equal = 0
    fc.assert(
      fc.property(pair, ([a, b]) => {
        const [x, y] = [ratio(a), ratio(b)]
        const same = x.over * y.under === y.over * x.under
        const [one, other] = [canonicalNumber(parseDecimal(a)!), canonicalNumber(parseDecimal(b)!)]
        expect(one === other, `${a} and ${b}`).toBe(same)
        expect(() => JSON.parse(one)).not.toThrow()
        const back = ratio(one)
        expect(back.over * x.under).toBe(x.over * back.under)
        expect(canonicalNumber(parseDecimal(one)!)).toBe(one)
        if (same && a !== b) equal++
      }),
      { numRuns: runs(3000) },
    )
    expect(equal).toBeGreaterThan(500)
  })

  it('that are whole become whole numbers, others do not', () => {
    fc.assert(
      fc.property(number, (text) => {
        const { over, under } = ratio(text)
        expect(toInteger(parseDecimal(text)!), text).toBe(over % under === 0n ? over / under : 'fraction')
      }),
      { numRuns: runs(1000) },
    )
  })

  it('of any size are told apart without being written out', () => {
    const text = (t: string): string => canonicalNumber(parseDecimal(t)!)
    expect(text('1e999999999999')).toBe(text('0.1e1000000000000'))
    expect(text('1e999999999999')).not.toBe(text('1e999999999998'))
    expect(text('1e-999999999999')).not.toBe(text('0'))
    expect(toInteger(parseDecimal('1e999999999999')!)).toBe('huge')
    expect(toInteger(parseDecimal('1e-999999999999')!)).toBe('fraction')
    expect(parseDecimal(`1e${'9'.repeat(1001)}`)).toBeUndefined()
    expect(text(`0e${'9'.repeat(1001)}`)).toBe('0')
  })

  it.each(['', '-', '+1', '01', '.5', '5.', '1e', '1e+', 'Infinity', 'NaN', '0x10', ' 1', '1 ', '1_0'])(
    '%j is none',
    (text) => {
      expect(parseDecimal(text)).toBeUndefined()
    },
  )
})
