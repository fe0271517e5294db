/**
 * The scanner against an outside reader of the same standard (RFC 8259): the JSON.parse of the language, on records
 * with single bytes changed, which is where tokenizers differ.
 */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import {
  ABSENT,
  ARRAY,
  F,
  FALSE,
  FIELDS,
  NULL,
  NUMBER,
  OBJECT,
  RecordScanner,
  STRING,
  TRUE,
} from '../../src/history/record-scanner.js'
import { runs } from '../oracles/decide.js'

const encoder = new TextEncoder()
const strict = new TextDecoder('utf-8', { fatal: true, ignoreBOM: true })

/** What the language's own parser makes of the bytes; undefined when they are no JSON object in UTF-8. */
function parsed(bytes: Uint8Array): Record<string, unknown> | undefined {
  try {
    const value: unknown = JSON.parse(strict.decode(bytes))
    return typeof value === 'object' && value !== null && !Array.isArray(value)
      ? (value as Record<string, unknown>)
      : undefined
  } catch {
    return undefined
  }
}

function typeOf(value: unknown): number {
  if (value === undefined) return ABSENT
  if (value === null) return NULL
  if (typeof value === 'boolean') return value ? TRUE : FALSE
  if (typeof value === 'number') return NUMBER
  if (typeof value === 'string') return STRING
  return Array.isArray(value) ? ARRAY : OBJECT
}

const RECORDS = [
  '{"client":"gate-3","op":"write","key":"berth/2","value":{"a":[1,-2.5e+3,{}],"b":[]},"start":0,"end":17}',
  '{ "history" : 1 , "unit" : "ms" , "initial" : { "k\\u00e9" : null , "ü€😀" : [ true , false ] } , "x" : 0.10 }',
  '{"id":"\\"\\\\\\/\\b\\f\\n\\r\\t\\ud83d\\ude00\\uD800","end":-0e-0,"saw":[[[[1]]],"\u2028"],"v\\u0061lue":10}',
  '{}',
]
const BYTES = [
  ...encoder.encode('{}[]",:\\/ \t\r0123456789-+.eEuntrfals\u00e9'),
  0,
  0x1f,
  0x7f,
  0x80,
  0xc0,
  0xff,
  0xed,
]

const edit = fc.record({
  at: fc.nat(),
  byte: fc.oneof(fc.constantFrom(...BYTES), fc.nat(255)),
  how: fc.constantFrom('put', 'put', 'insert', 'remove', 'swap', 'cut'),
})

function edited(bytes: Uint8Array, { at, byte, how }: { at: number; byte: number; how: string }): Uint8Array {
  const i = at % (bytes.length + 1)
  const list = [...bytes]
  if (how === 'insert') list.splice(i, 0, byte)
  else if (how === 'remove') list.splice(i, 1)
  else if (how === 'swap') list.splice(i, 2, ...list.slice(i, i + 2).reverse())
  else if (how === 'cut') list.length = i
  else if (i < list.length) list[i] = byte
  return Uint8Array.from(list)
}

describe('the scanner', () => {
  it('takes what JSON.parse takes, reads in it the same members, and refuses the rest', () => {
    // One scanner for all, as in a file: nothing of a line may be left for the next.
    const scanner = new RecordScanner()
    const seen = { taken: 0, refused: 0, twice: 0 }
    fc.assert(
      fc.property(
        fc.constantFrom(...RECORDS),
        fc.array(edit, { maxLength: 3 }),
        fc.nat(3),
        (record, edits, padding) => {
          const line = edits.reduce(edited, encoder.encode(record))
          // The line in the middle of a chunk, between bytes that would change its meaning.
          const chunk = new Uint8Array(padding + line.length + 4).fill(0x30)
          chunk.set(line, padding)
          const isTaken = scanner.scan(chunk, padding, padding + line.length)
          const value = parsed(line)
          const what = JSON.stringify(new TextDecoder().decode(line))
          if (!isTaken && scanner.failure.code === 'duplicate-member') {
            seen.twice++
            return
          }
          expect(isTaken, what).toBe(value !== undefined)
          if (!value) {
            expect(scanner.failure.at).toBeGreaterThanOrEqual(padding)
            expect(scanner.failure.at).toBeLessThanOrEqual(padding + line.length)
            seen.refused++
            return
          }
          for (const field of FIELDS) {
            const own = Object.hasOwn(value, field) ? value[field] : undefined
            expect(scanner.type[F[field]], `${field} of ${what}`).toBe(typeOf(own))
            if (own === undefined) continue
            if (typeof own === 'string') expect(scanner.text(F[field]), what).toBe(own)
            expect(JSON.parse(scanner.raw(F[field])), what).toEqual(own)
          }
          seen.taken++
        },
      ),
      { numRuns: runs(4000) },
    )
    expect(Math.min(seen.taken, seen.refused)).toBeGreaterThan(500)
    expect(seen.twice).toBeLessThan(500)
  })

  it('refuses every beginning of a record, and each of them at its end or before', () => {
    const scanner = new RecordScanner()
    for (const record of RECORDS) {
      const bytes = encoder.encode(record)
      for (let end = 0; end < bytes.length; end++) {
        expect(scanner.scan(bytes, 0, end), record.slice(0, end)).toBe(false)
        expect(scanner.failure.at).toBeLessThanOrEqual(end)
      }
      expect(scanner.scan(bytes, 0, bytes.length)).toBe(true)
    }
  })

  it('nests to 512 levels and no further', () => {
    const scanner = new RecordScanner()
    for (const [open, close] of ['[]', ['{"a":', '}']]) {
      for (const depth of [511, 512, 513, 100_000]) {
        const middle = open === '[' ? '' : '1'
        const bytes = encoder.encode(`{"value":${open.repeat(depth)}${middle}${close.repeat(depth)}}`)
        expect(scanner.scan(bytes, 0, bytes.length), `${depth} of ${open}`).toBe(depth <= 512)
        if (depth > 512) expect(scanner.failure.code).toBe('too-deep')
      }
    }
  })
})
