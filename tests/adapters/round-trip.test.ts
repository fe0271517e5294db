/**
 * A history written as somebody else's log and converted back is the same history, record for record and digit for digit.
 */
import { stringify } from 'csv-stringify/sync'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { converted } from './converting.js'

/** An operation with its values as JSON text; `undefined` is not there. */
interface Operation {
  readonly client: string
  readonly op: 'read' | 'write' | 'increment' | 'cas' | 'delete'
  readonly key: string
  readonly by?: string
  readonly expect?: string
  readonly value?: string
  readonly basis?: string
  readonly applied?: 'false'
  readonly saw?: string
  readonly start: bigint
  readonly end?: bigint
  readonly outcome: 'acked' | 'refused' | 'unsure'
  readonly host?: string
  readonly id?: string
}

const name = fc
  .string({ unit: 'grapheme', minLength: 1, maxLength: 5 })
  .filter((text) => !text.includes('\0'))
const whole = fc.bigInt(-(2n ** 70n), 2n ** 70n).map(String)
const value = fc.oneof(
  whole,
  fc.json({ maxDepth: 2 }).map((text) => JSON.stringify(JSON.parse(text))),
  fc.constantFrom('null', '0.10', '1e400', '""', '"ab"', '" "', '"7"', '"\\u0000"'),
)
const optional = <T>(some: fc.Arbitrary<T>): fc.Arbitrary<T | undefined> =>
  fc.option(some, { nil: undefined })
const outcome = fc.constantFrom('acked', 'acked', 'acked', 'refused', 'unsure')

/** What an operation has beside client, times, host and id. */
const body: fc.Arbitrary<Partial<Operation>> = fc.oneof(
  fc.record({ op: fc.constant('read'), value, outcome }).map(({ value, ...rest }) => ({
    ...rest,
    ...(rest.outcome === 'acked' ? { value } : {}),
  })),
  fc.record({ op: fc.constant('write'), value, basis: optional(value), outcome }),
  fc.record({ op: fc.constant('delete'), outcome }),
  fc
    .record({ op: fc.constant('increment'), by: whole, count: optional(whole), outcome })
    .map(({ count, ...rest }) => ({
      ...rest,
      ...(rest.outcome === 'acked' && count !== undefined ? { value: count } : {}),
    })),
  fc
    .record({
      op: fc.constant('cas'),
      expect: value,
      value,
      applied: fc.boolean(),
      saw: optional(value),
      outcome,
    })
    .map(({ applied, saw, ...rest }) => ({
      ...rest,
      ...(rest.outcome === 'acked' && !applied ? { applied: 'false' as const, ...(saw ? { saw } : {}) } : {}),
    })),
) as fc.Arbitrary<Partial<Operation>>

const step = fc.record({
  body,
  client: fc.nat(3),
  key: fc.nat(2),
  gap: fc.bigInt(1n, 10n ** 12n),
  took: fc.bigInt(0n, 10n ** 9n),
  host: optional(name),
  hasId: fc.boolean(),
})

/** Histories that a reader takes: one request at a time a client, counters hold numbers. */
const history: fc.Arbitrary<Operation[]> = fc
  .record({
    clients: fc.uniqueArray(name, { minLength: 4, maxLength: 4 }),
    keys: fc.uniqueArray(name, { minLength: 3, maxLength: 3 }),
    steps: fc.array(step, { minLength: 1, maxLength: 12 }),
    givesUp: fc.boolean(),
  })
  .map(({ clients, keys, steps, givesUp }) => {
    let now = 1_719_864_000_000_000_000n
    return steps.map(({ body, client, key, gap, took, host, hasId }, i) => {
      now += gap
      const start = now
      now += took
      const isCount = body.op === 'increment'
      const isLast = givesUp && i === steps.length - 1
      return {
        client: clients[client],
        ...body,
        key: isCount ? `${keys[key]}/count` : keys[key],
        start,
        ...(isLast && body.outcome === 'unsure' ? {} : { end: now }),
        ...(host === undefined ? {} : { host }),
        ...(hasId ? { id: `id-${i}` } : {}),
      } as Operation
    })
  })

/** The line of a history, members in the order in which the converter writes them. */
function lineOf(operation: Operation): string {
  const { client, op, key, by, expect, value, basis, applied, saw, start, end, outcome, host, id } = operation
  const members: [string, string | undefined][] = [
    ['client', JSON.stringify(client)],
    ['op', `"${op}"`],
    ['key', JSON.stringify(key)],
    ['by', by],
    ['expect', expect],
    ['value', value],
    ['basis', basis],
    ['applied', applied],
    ['saw', saw],
    ['start', String(start)],
    ['end', end === undefined ? undefined : String(end)],
    ['outcome', outcome === 'acked' ? undefined : `"${outcome}"`],
    ['host', host === undefined ? undefined : JSON.stringify(host)],
    ['id', id === undefined ? undefined : JSON.stringify(id)],
  ]
  return `{${members.flatMap(([name, text]) => (text === undefined ? [] : [`"${name}":${text}`])).join(',')}}`
}

const COLUMNS = [
  'client',
  'op',
  'key',
  'by',
  'expect',
  'value',
  'basis',
  'applied',
  'saw',
  'start',
  'end',
  'outcome',
  'host',
  'id',
] as const

const CSV_MAPPING = `mapping: 1
format: csv
unit: ns
client: client
op: op
key: key
value:
  read: {field: value, as: json}
  write: {field: value, as: json}
  cas: {field: value, as: json}
  increment: {field: value, as: json}
by: {field: by, as: number}
expect: {field: expect, as: json}
applied: {field: applied, default: true}
saw: {field: saw, as: json}
basis: {field: basis, as: json}
start: start
end: end
outcome: [{field: outcome, equals: acked, outcome: acked}, {field: outcome, equals: refused, outcome: refused}]
host: host
id: id
`

const NDJSON_MAPPING = `mapping: 1
format: ndjson
client: who
op: {field: what.verb, translate: {R: read, W: write, I: increment, C: cas, D: delete}}
key: "{what.table}{what.row}"
value: {read: reply, write: body, cas: body, increment: reply}
by: n
expect: if
applied: {field: done, translate: {"1": true, "0": false}}
saw: reply
basis: /seen~1value
start: {field: times.0, unit: s}
duration: {field: times.1, unit: us}
outcome:
  - {field: code, in: [200, 201], outcome: acked}
  - {field: code, matches: "^4", outcome: refused}
host: where
id: trace
`

function csv(operations: readonly Operation[]): string {
  const rows = operations.map((operation) => COLUMNS.map((column) => String(operation[column] ?? '')))
  return stringify([[...COLUMNS], ...rows])
}

/** Nanoseconds as a decimal of a unit that is 10^places of them. */
function decimal(ns: bigint, places: number): string {
  const digits = String(ns).padStart(places + 1, '0')
  return `${digits.slice(0, -places)}.${digits.slice(-places)}`
}

function foreign(operations: readonly Operation[]): string {
  const verbs = { read: 'R', write: 'W', increment: 'I', cas: 'C', delete: 'D' }
  const codes = { acked: '200', refused: '"403 forbidden"', unsure: '504' }
  return operations
    .map(({ client, op, key, by, expect, value, basis, applied, saw, start, end, outcome, host, id }) => {
      const members: [string, string | undefined][] = [
        ['who', JSON.stringify(client)],
        [
          'what',
          `{"verb":"${verbs[op]}","table":${JSON.stringify(key[0])},"row":${JSON.stringify(key.slice(1))}}`,
        ],
        [op === 'write' || op === 'cas' ? 'body' : 'reply', value],
        ['n', by],
        ['if', expect],
        ['done', op === 'cas' ? (applied === 'false' ? '0' : '"1"') : undefined],
        ['reply', saw],
        ['seen/value', basis],
        ['times', `[${decimal(start, 9)},${end === undefined ? 'null' : decimal(end - start, 3)}]`],
        ['code', codes[outcome]],
        ['where', host === undefined ? undefined : JSON.stringify(host)],
        ['trace', id === undefined ? undefined : JSON.stringify(id)],
      ]
      return `{ ${members.flatMap(([name, text]) => (text === undefined ? [] : [`"${name}" : ${text}`])).join(' , ')} }\n`
    })
    .join('')
}

describe('a history written as another log', () => {
  it.each([
    ['CSV', CSV_MAPPING, csv],
    ['foreign NDJSON', NDJSON_MAPPING, foreign],
  ] as const)('of %s comes back the same, and is read', async (_, mapping, write) => {
    await fc.assert(
      fc.asyncProperty(history, async (operations) => {
        const { text } = await converted(mapping, write(operations))
        expect(text.split('\n').slice(1, -1)).toEqual(operations.map(lineOf))
        const read = await readHistory([textSource('converted', text)])
        expect(read.count).toBe(operations.length)
      }),
      { numRuns: 300 },
    )
  })
})
