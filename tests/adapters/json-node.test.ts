import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type JsonNode, type JsonTrouble, jsonText, parseJson } from '../../src/adapters/json-node.js'

describe('reading JSON exactly', () => {
  it('keeps the digits of numbers that no double holds', () => {
    const text = '[9007199254740993,-0.10,1e400,18446744073709551615]'
    expect(jsonText(parseJson(text))).toBe(text)
  })

  it('agrees with the language’s own reader on what texts say', () => {
    fc.assert(
      fc.property(fc.json(), (text) => {
        expect(JSON.parse(jsonText(parseJson(text)))).toEqual(JSON.parse(text))
      }),
    )
  })

  it('agrees with the language’s own reader on which texts are JSON', () => {
    const piece = fc.constantFrom(...'{}[]":,\\u0eE+-.1 \ttrue\u0001', 'null', '"a"', '\n')
    fc.assert(
      fc.property(fc.array(piece, { maxLength: 8 }), (pieces) => {
        const text = pieces.join('')
        expect(accepts(parseJson, text)).toBe(accepts(JSON.parse, text))
      }),
      { numRuns: 2000 },
    )
  })

  it.each([
    ['{"a":1,"a":2}', 7, 'each member once'],
    ['{"a" 1}', 5, 'a colon'],
    ['"\\x"', 2, 'an escape that JSON knows'],
    ['"a', 2, 'the end of the string'],
    ['[1 2]', 3, 'a comma or the end of the array'],
    ['01', 1, 'the end after the value'],
    ['', 0, 'a JSON value'],
  ])('refuses %s at the character at fault', (text, at, expected) => {
    expect(trouble(text)).toMatchObject({ at, expected })
  })

  it('keeps members named like those of every object, and lone surrogates', () => {
    const text = '{"__proto__":1,"constructor":"\\ud800"}'
    expect(jsonText(parseJson(text))).toBe(text)
  })

  it('refuses nesting that readers of histories would not take', () => {
    expect(trouble('['.repeat(600) + ']'.repeat(600))).toMatchObject({ at: 500 })
  })
})

function accepts(read: (text: string) => unknown, text: string): boolean {
  try {
    read(text)
    return true
  } catch {
    return false
  }
}

function trouble(text: string): JsonTrouble | JsonNode {
  try {
    return parseJson(text)
  } catch (error) {
    return error as JsonTrouble
  }
}
