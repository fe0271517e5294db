import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type History, KIND_NAMES, NO_VALUE, OUTCOME_NAMES } from '../../src/history/columns.js'
import { readTolerantly } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { canonicalText } from '../../src/history/values.js'
import { runs } from '../oracles/decide.js'
import { readPlainly } from './plain-reader.js'

const name = fc.oneof(
  fc.constantFrom('a', 'b', 'k', 'berth/2', '__proto__'),
  fc.string({ unit: 'grapheme', maxLength: 6 }),
)
const value = fc.jsonValue({ maxDepth: 2 })
const time = fc.integer({ min: -1000, max: 1_000_000 })

const operation = fc
  .record({
    op: fc.constantFrom('read', 'write', 'increment', 'cas', 'delete', 'put'),
    key: name,
    value,
    expect: value,
    start: time,
    length: fc.nat(50),
    outcome: fc.constantFrom(undefined, 'acked', 'refused', 'unsure', 'maybe'),
    host: fc.option(name, { nil: undefined }),
    by: fc.oneof(fc.constantFrom(undefined, 1.5, 1e21), fc.integer({ min: -5, max: 5 })),
    answers: fc.integer({ min: 0, max: 9 }).map((n) => n > 0),
    ends: fc.constantFrom('there', 'there', 'there', 'there', 'null', 'missing'),
    spelling: fc.constantFrom('number', 'number', 'text', 'exponent'),
    applied: fc.constantFrom(undefined, true, false),
    split: fc.boolean(),
    unknown: value,
  })
  .map(({ op, key, value, expect, start, length, outcome, host, by, applied, split, unknown, ...more }) => ({
    fields: {
      op,
      key,
      host,
      'trace id': unknown,
      ...(op === 'write' || (op === 'read' && more.answers) ? { value } : {}),
      ...(op === 'cas' ? { value, expect, applied } : {}),
      ...(op === 'increment' ? { by } : {}),
    } as Record<string, unknown>,
    start: spelled(start, more.spelling),
    end:
      more.ends === 'there'
        ? spelled(start + length, more.spelling)
        : more.ends === 'null'
          ? null
          : undefined,
    outcome,
    split: split && outcome !== 'maybe' && more.ends === 'there',
  }))

function spelled(time: number, how: string): number | string {
  return how === 'number' ? time : how === 'text' ? `${time}` : `${time * 10}e-1`
}

/** Lines of a history with each client used once, members in random order, some white space. */
const records = fc
  .array(fc.tuple(operation, fc.infiniteStream(fc.nat(100)), fc.constantFrom('', ' ', '\t')), {
    minLength: 1,
    maxLength: 6,
  })
  .map((drafts) =>
    drafts.flatMap(([draft, order, white], i) => {
      const shuffled = (record: Record<string, unknown>): string => {
        const members = Object.entries(record)
          .filter(([, each]) => each !== undefined)
          .map((member) => ({ member, place: order.next().value as number }))
          .sort((a, b) => a.place - b.place)
        return `${white}{${members.map(({ member: [n, v] }) => `${white}${JSON.stringify(n)}${white}:${JSON.stringify(v)}`).join(`${white},`)}}${white}`
      }
      const common = { ...draft.fields, client: `client ${i}`, start: draft.start }
      if (!draft.split) return [shuffled({ ...common, end: draft.end, outcome: draft.outcome })]
      const { value: answer, applied, ...open } = common as Record<string, unknown>
      const isRead = draft.fields.op === 'read'
      return [
        shuffled({ id: `id ${i}`, ...(isRead ? open : common), ...(isRead ? {} : { applied: undefined }) }),
        shuffled({
          id: `id ${i}`,
          end: draft.end,
          outcome: draft.outcome,
          applied,
          ...(isRead ? { value: answer } : {}),
        }),
      ]
    }),
  )

const history = fc
  .tuple(
    fc.constantFrom(
      [],
      ['{"history":1}'],
      ['{"unit":"us","history":1.0,"clockError":"2.5"}'],
      ['{"history":1,"unit":"s","initial":{"k":1}}'],
    ),
    records,
    fc.constantFrom([], ['{"mark":"power cut","start":1,"end":null}'], ['{"mark":1,"start":1}']),
  )
  .map(([header, lines, marks]) => [...header, ...lines, ...marks, ''].join('\n'))

/** An operation as both readers can tell it. */
function told(h: History, i: number): Record<string, unknown> {
  const text = (id: number): string | undefined => (id === NO_VALUE ? undefined : h.values.text(id))
  return {
    client: h.clients.name(h.client[i]),
    key: h.keys.name(h.key[i]),
    op: KIND_NAMES[h.kind[i]],
    outcome: OUTCOME_NAMES[h.outcome[i]],
    host: h.host[i] < 0 ? undefined : h.hosts.name(h.host[i]),
    start: Number(h.times.startNs(i)),
    end: h.hasEnd[i] ? Number(h.times.endNs(i)) : undefined,
    value: h.kind[i] === 4 ? undefined : text(h.value[i]),
    extra: text(h.extra[i]),
    applied: h.applied[i] === 1,
  }
}

function toldPlainly(op: Record<string, unknown>, unitNs: number): Record<string, unknown> {
  const text = (v: unknown): string | undefined =>
    v === undefined ? undefined : canonicalText(JSON.stringify(v))
  const acked = op.outcome === 'acked'
  const readsValue = op.op === 'read' || op.op === 'increment'
  return {
    client: op.client,
    key: op.key,
    op: op.op,
    outcome: op.outcome,
    host: op.host,
    start: Number(op.start) * unitNs,
    end: (op.end ?? undefined) === undefined ? undefined : Number(op.end) * unitNs,
    value: readsValue && !acked ? undefined : text(op.value),
    extra: op.op === 'increment' ? text(op.by ?? 1) : op.op === 'cas' ? text(op.expect) : text(op.basis),
    applied: op.op === 'cas' && acked ? (op.applied ?? true) : true,
  }
}

describe('the scanner and the plain reader', () => {
  it('read the same records and refuse the same ones', async () => {
    let operations = 0
    let wrong = 0
    await fc.assert(
      fc.asyncProperty(history, async (text) => {
        const plain = await readPlainly(text)
        const { history: scanned, problems } = await readTolerantly([textSource('f', text)])
        // What only a whole history shows is not the plain reader's business.
        const refused = problems.filter(({ code }) => code !== 'number-as-string' && code !== 'empty-history')
        const whole = refused.filter(({ code }) => code !== 'close-without-open')
        expect(whole.length > 0, text).toBe(plain.wrong > 0)
        if (whole.length > 0) {
          wrong++
          return
        }
        expect(
          Array.from({ length: scanned.count }, (_, i) => told(scanned, i)),
          text,
        ).toEqual(plain.operations.map((op) => toldPlainly(op, plain.unitNs)))
        expect(scanned.marks.length, text).toBe(plain.marks.length)
        operations += scanned.count
      }),
      { numRuns: runs(1500) },
    )
    expect(operations).toBeGreaterThan(200)
    expect(wrong).toBeGreaterThan(100)
  })
})
