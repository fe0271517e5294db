import { isDeepStrictEqual } from 'node:util'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { NULL_VALUE } from '../../src/history/columns.js'
import { canonicalText, ValueTable, ValueTrouble } from '../../src/history/values.js'
import { runs } from '../oracles/decide.js'

/** Values of few parts, so that equal ones are met. */
const { value } = fc.letrec((tie) => ({
  value: fc.oneof(
    { maxDepth: 3 },
    fc.constantFrom<unknown>(
      null,
      true,
      false,
      0,
      1,
      -1,
      10,
      0.5,
      '',
      'a',
      '1',
      'ä',
      '😀',
      '\ud800',
      '"\\/\n',
      '\u2028',
    ),
    fc.array(tie('value'), { maxLength: 3 }),
    fc.dictionary(fc.constantFrom('a', 'b', '', '__proto__', 'ä', '\ud800', '\uffff', '😀'), tie('value'), {
      maxKeys: 3,
      noNullPrototype: true,
    }),
  ),
}))

const NUMBERS: Record<string, string[]> = {
  0: ['0', '-0', '0.0', '0e7'],
  1: ['1', '1.0', '1e0', '10e-1'],
  '-1': ['-1', '-1.00', '-0.1e1'],
  10: ['10', '1e1', '1E+1', '100e-1'],
  0.5: ['0.5', '5e-1', '0.50'],
}

/** The value as some program might write it; `choose` picks a number below its argument. */
function spelled(value: unknown, choose: (n: number) => number): string {
  const white = (): string => ['', '', ' ', '\t', '\n', '\r'][choose(6)]
  const text = (s: string): string =>
    `"${[...Array(s.length).keys()]
      .map((i) => {
        const unit = `\\u${s.charCodeAt(i).toString(16).padStart(4, '0')}`
        const isHalf = s.charCodeAt(i) >= 0xd800 && s.charCodeAt(i) <= 0xdfff
        return isHalf || choose(3) === 0 ? unit : JSON.stringify(s[i]).slice(1, -1)
      })
      .join('')}"`
  const inner = (): string => {
    if (typeof value === 'number') return NUMBERS[value][choose(NUMBERS[value].length)]
    if (typeof value === 'string') return text(value)
    if (Array.isArray(value)) return `[${value.map((each) => spelled(each, choose)).join(',')}${white()}]`
    if (typeof value !== 'object' || value === null) return String(value)
    const members = Object.entries(value).map(([name, each]) => ({ name, each, place: choose(100) }))
    members.sort((a, b) => a.place - b.place)
    return `{${white()}${members.map(({ name, each }) => `${text(name)}${white()}:${spelled(each, choose)}`).join(`,${white()}`)}}`
  }
  return `${white()}${inner()}${white()}`
}

describe('values', () => {
  it('have one canonical text however they are written, and it is JSON of the same value', () => {
    fc.assert(
      fc.property(value, fc.infiniteStream(fc.nat(1000)), (v, numbers) => {
        const written = spelled(v, (n) => (numbers.next().value as number) % n)
        const text = canonicalText(written)
        expect(text, written).toBe(canonicalText(JSON.stringify(v)))
        expect(isDeepStrictEqual(JSON.parse(text), v), written).toBe(true)
      }),
      { numRuns: runs(1500) },
    )
  })

  it('are equal exactly when they are the same value', () => {
    let equal = 0
    fc.assert(
      fc.property(value, value, (a, b) => {
        const table = new ValueTable()
        const ids = [a, b].map((v) => table.internText(canonicalText(JSON.stringify(v))))
        expect(ids[0] === ids[1]).toBe(isDeepStrictEqual(a, b))
        expect(ids.map((id) => id === NULL_VALUE)).toEqual([a === null, b === null])
        expect(ids.map((id) => JSON.parse(table.text(id)))).toEqual([a, b])
        if (ids[0] === ids[1]) equal++
      }),
      { numRuns: runs(3000) },
    )
    expect(equal).toBeGreaterThan(20)
  })

  it('keep whole numbers exact, and nothing else for one', () => {
    const table = new ValueTable()
    const whole = (json: string): bigint | undefined => table.integer(table.internText(canonicalText(json)))
    expect(whole('18446744073709551615')).toBe(18446744073709551615n)
    expect(whole('-9223372036854775809.0')).toBe(-9223372036854775809n)
    expect(whole('1e30')).toBe(10n ** 30n)
    for (const json of ['0.5', '"1"', 'null', 'true', '[1]', '1e999999999'])
      expect(whole(json), json).toBeUndefined()
  })

  it('that name a member twice, or a number beyond all reason, are refused', () => {
    for (const json of ['{"a":1,"a":1}', '[{"b":{"a":1,"\\u0061":2}}]'])
      expect(() => canonicalText(json)).toThrow(ValueTrouble)
    expect(() => canonicalText(`[1e${'9'.repeat(2000)}]`)).toThrow(ValueTrouble)
  })
})
