import { context, SpanKind, SpanStatusCode, trace } from '@opentelemetry/api'
import { JsonTraceSerializer } from '@opentelemetry/otlp-transformer'
import { resourceFromAttributes } from '@opentelemetry/resources'
import { BasicTracerProvider, InMemorySpanExporter, SimpleSpanProcessor } from '@opentelemetry/sdk-trace-base'
import * as stable from '@opentelemetry/semantic-conventions'
import * as incubating from '@opentelemetry/semantic-conventions/incubating'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { chunked, converted, readable, refusal } from './converting.js'

const MAPPING = `mapping: 1
format: otlp
op: {translate: {GET: read, SET: write, HINCRBY: increment}}
key: berth/{app.berth}
value: {field: app.vessel}
by: app.by
`

type Json = { [name: string]: unknown }

function attribute(key: string, value: unknown): Json {
  return { key, value: typeof value === 'object' ? value : { stringValue: value } }
}

const RESOURCE = {
  attributes: [attribute('service.instance.id', 'gate-1'), attribute('host.name', 'quay-a')],
}

/** A span of a database client; what is given takes the place of what is usual. */
function span(attributes: Json, rest: Json = {}): Json {
  const all = {
    'db.system.name': 'redis',
    'db.operation.name': 'SET',
    'app.berth': '2',
    'app.vessel': 'Alma',
    ...attributes,
  }
  return {
    traceId: '5b8efff798038103d269b633813fc60c',
    spanId: 'eee19b7ec3c1b174',
    name: 'SET',
    kind: 3,
    startTimeUnixNano: '1719864000000000001',
    endTimeUnixNano: '1719864000000000009',
    attributes: Object.entries(all)
      .filter(([, value]) => value !== undefined)
      .map(([key, value]) => attribute(key, value)),
    ...rest,
  }
}

function documentOf(spans: readonly Json[], resource: Json = RESOURCE): Json {
  return {
    resourceSpans: [{ resource, scopeSpans: [{ scope: { name: 'harbour', version: '1.4' }, spans }] }],
  }
}

describe('OpenTelemetry spans', () => {
  it('become operations by the conventions, with what only the program knows by the mapping', async () => {
    const { text } = await readable(
      MAPPING,
      JSON.stringify(documentOf([span({ 'server.address': 'store-1' })])),
    )
    expect(text.split('\n')[1]).toBe(
      '{"client":"gate-1#1","op":"write","key":"berth/2","value":"Alma","start":1719864000000000001,"end":1719864000000000009,' +
        '"host":"quay-a","traceId":"5b8efff798038103d269b633813fc60c","spanId":"eee19b7ec3c1b174","server":"store-1"}',
    )
  })

  it('are read alike as one document or one a line, pretty or not, in whatever chunks they come', async () => {
    const spans = [1, 2, 3].map((n) =>
      span(
        { 'app.vessel': `V"${n}\\ ⛴ {[` },
        { startTimeUnixNano: `${n}000`, endTimeUnixNano: `${n}500`, spanId: `0${n}` },
      ),
    )
    const { text } = await readable(MAPPING, JSON.stringify(documentOf(spans)))
    expect(text.split('\n')).toHaveLength(5)
    const pretty = JSON.stringify(documentOf(spans), null, 2)
    const lines = `${spans.map((each) => `${JSON.stringify(documentOf([each]))}\n`).join('')}\n`
    for (const log of [pretty, lines, `\ufeff${lines}`]) {
      expect((await converted(MAPPING, log)).text).toBe(text)
      for (const size of [1, 7, 100])
        expect((await converted(MAPPING, chunked('log-1', log, size))).text).toBe(text)
    }
  })

  it('are read alike wherever their resource and scope stand, and beside members that are not known', async () => {
    const mapping = `${MAPPING}keep: {library: scope.name, quay: resource.host.name}\n`
    const { text } = await readable(mapping, JSON.stringify(documentOf([span({})])))
    expect(text).toContain('"library":"harbour","quay":"quay-a"')
    const scope = { name: 'harbour' }
    const late = {
      more: [{ spans: 1 }],
      resourceSpans: [
        { schemaUrl: 'x', scopeSpans: [{ spans: [span({})], schemaUrl: null, scope }], resource: RESOURCE },
      ],
      partial: {},
    }
    expect((await converted(mapping, JSON.stringify(late))).text).toBe(text)
  })

  it('keep 64-bit attributes exact, as strings or as numbers, and values of any shape', async () => {
    const value = (json: string): string =>
      JSON.stringify(documentOf([span({ 'app.vessel': 'HERE' })])).replace('{"stringValue":"HERE"}', json)
    const stored = async (json: string): Promise<unknown> =>
      (await readable(MAPPING, value(json))).text.match(/"value":(.*),"start"/)![1]
    expect(await stored('{"intValue":"9223372036854775807"}')).toBe('9223372036854775807')
    expect(await stored('{"intValue":-9007199254740993}')).toBe('-9007199254740993')
    expect(await stored('{"doubleValue":0.10}')).toBe('0.10')
    expect(await stored('{"doubleValue":"NaN"}')).toBe('"NaN"')
    expect(await stored('{"boolValue":false}')).toBe('false')
    expect(await stored('{"bytesValue":"AAE="}')).toBe('"AAE="')
    expect(await stored('{"arrayValue":{"values":[{"intValue":"1"},{"stringValue":"a"}]}}')).toBe('[1,"a"]')
    expect(await stored('{"kvlistValue":{"values":[{"key":"n","value":{"intValue":"1"}}]}}')).toBe('{"n":1}')
    expect(await stored('{"arrayValue":{}}')).toBe('[]')
    expect(await stored('{}')).toBe('null')
    for (const wrong of ['{"intValue":"1.5"}', '{"constructor":1}', '{"intValue":"1","boolValue":true}', '7'])
      await expect(stored(wrong), wrong).rejects.toThrow(/span eee19b7ec3c1b174/)
  })

  it('have start and end as strings or as numbers, exact', async () => {
    const log = JSON.stringify(documentOf([span({})])).replace('"1719864000000000009"', '1719864000000000009')
    expect((await readable(MAPPING, log)).records[0].end).toBe('1719864000000000009')
  })

  it('are acked without error, unsure with one, refused only by a rule of the mapping', async () => {
    const outcome = async (mapping: string, attributes: Json, rest: Json = {}): Promise<unknown> =>
      (await readable(mapping, JSON.stringify(documentOf([span(attributes, rest)])))).records[0].outcome ??
      'acked'
    expect(await outcome(MAPPING, {})).toBe('acked')
    expect(await outcome(MAPPING, {}, { status: { code: 1 } })).toBe('acked')
    expect(await outcome(MAPPING, {}, { status: { code: 2, message: 'timed out' } })).toBe('unsure')
    expect(await outcome(MAPPING, {}, { status: { code: 'STATUS_CODE_ERROR' } })).toBe('unsure')
    expect(await outcome(MAPPING, { 'error.type': 'timeout' })).toBe('unsure')
    const own = `${MAPPING}outcome: [{field: error.type, equals: READONLY, outcome: refused}, {field: status.code, equals: unset, outcome: acked}]\n`
    expect(await outcome(own, { 'error.type': 'READONLY' })).toBe('refused')
    expect(await outcome(own, {})).toBe('acked')
    expect(await outcome(own, {}, { status: { code: 2 } })).toBe('unsure')
  })

  it('have their operation by newer and older names, or the first word of the statement', async () => {
    const op = async (attributes: Json): Promise<unknown> =>
      (
        await readable(
          MAPPING,
          JSON.stringify(documentOf([span({ 'db.operation.name': undefined, ...attributes })])),
        )
      ).records[0].op
    expect(await op({ 'db.operation': 'GET' })).toBe('read')
    expect(await op({ 'db.query.text': ' GET berth/2' })).toBe('read')
    expect(await op({ 'db.statement': 'SET berth/2 ?' })).toBe('write')
    await expect(op({})).rejects.toThrow(
      'found no db.operation.name, db.operation, db.query.text or db.statement (span',
    )
    await expect(op({ 'db.operation.name': 'LPUSH' })).rejects.toThrow(
      'found the op "LPUSH" (span eee19b7ec3c1b174)',
    )
  })

  it('that are not of a database client are passed over and counted', async () => {
    const spans = [
      span({}),
      span({}, { kind: 'SPAN_KIND_SERVER' }),
      span({}, { kind: 1 }),
      span({ 'db.system.name': undefined }),
    ]
    const log = JSON.stringify(documentOf(spans))
    const { records, conversion } = await readable(MAPPING, log)
    expect(records).toHaveLength(1)
    expect([...conversion.passedOver]).toEqual([
      ['of kind server', 1],
      ['of kind internal', 1],
      ['of no database (no db.system.name)', 1],
    ])
    const all = `${MAPPING}otlp: {kinds: [client, server, internal], database: false}\n`
    expect((await converted(all, log)).records).toHaveLength(4)
    expect(await refusal(MAPPING, JSON.stringify(documentOf(spans.slice(1))))).toEqual([
      'log-1: found no operations (spans passed over: 1 of kind server, 1 of kind internal, 1 of no database (no db.system.name)), expected at least one record that is an operation; check the rules that pass records over (skip, marks, otlp)',
    ])
  })

  it('that lack what an operation needs are named, with what to do', async () => {
    const log = (attributes: Json, rest: Json = {}): string =>
      `{"resourceSpans":[]}\n${JSON.stringify(documentOf([span(attributes, rest)]))}\n`
    expect(await refusal(MAPPING, log({ 'app.vessel': undefined }))).toEqual([
      'log-1:2: found a write, and no app.vessel (span eee19b7ec3c1b174), expected value of the write; spans carry no values unless the program adds them: let it set an attribute, and name that in the mapping',
    ])
    expect(await refusal(MAPPING, log({ 'app.berth': undefined }))).toEqual([
      'log-1:2: found no app.berth (span eee19b7ec3c1b174), expected key; pass such records over (skip), or name another field',
    ])
    expect((await refusal(MAPPING, log({}, { startTimeUnixNano: '0' })))[0]).toContain('expected the start')
    expect((await refusal(MAPPING, log({}, { kind: 9 })))[0]).toContain(
      'found kind "9" (span eee19b7ec3c1b174)',
    )
    expect((await refusal(MAPPING, log({}, { attributes: {} })))[0]).toContain(
      'expected attributes, an array',
    )
    const unended = await readable(MAPPING, log({}, { endTimeUnixNano: '0' }))
    expect(unended.records[0]).toMatchObject({ outcome: 'unsure' })
  })

  it.each([
    ['[]', 'log-1:1: found "[]", expected an OTLP document, an object'],
    ['{"resourceSpans":{}}', 'log-1:1: found "{}}", expected resourceSpans, an array'],
    [
      '{"resourceSpans":[\n{"scopeSpans":[\n{"spans":[{]}]}',
      'log-1:3: found "]", expected a member name in quotes',
    ],
    ['{"resourceSpans":[],"resourceSpans":[]}', 'log-1:1: found the member "resourceSpans" twice'],
    ['{"resourceSpans":[', 'log-1:1: found the end of the file'],
    [
      '{"resourceSpans":[{"scopeSpans":[{"spans":[{"traceId":"5b8',
      'log-1:1: found the end of the file, expected the end of the value; export or copy the file again',
    ],
    [
      '{"resourceSpans":[{"scopeSpans":[{"spans":[7]}]}]}',
      'log-1:1: found "7" (a span without id), expected a span, an object',
    ],
    [`{"a":"${'x'.repeat(17 * 1024 * 1024)}"}`, 'log-1:1: found a value of over 16 Mi characters'],
    ['{"a":tru}', 'log-1:1: found "tru"'],
  ])('refuse what is no export, case %#', async (log, message) => {
    expect((await refusal(MAPPING, log)).join('\n')).toContain(message)
  })

  it('in a last line that a crash cut short are set aside with a warning', async () => {
    const line = JSON.stringify(documentOf([span({})]))
    const { records, conversion } = await readable(MAPPING, `${line}\n${line.slice(0, 200)}`)
    expect(records).toHaveLength(1)
    expect(conversion.warnings).toMatchObject([{ file: 'log-1', line: 2 }])
  })

  it('cut anywhere never give anything but whole records, a warning or an error', async () => {
    const line = JSON.stringify(documentOf([span({})]))
    const { records } = await converted(MAPPING, line)
    await fc.assert(
      fc.asyncProperty(fc.integer({ min: 1, max: line.length - 1 }), async (at) => {
        const cut = await converted(MAPPING, `${line}\n${line.slice(0, at)}`)
        expect(
          cut.records.every(
            (record) => JSON.stringify(record) === JSON.stringify(records[0]) || record.client === 'gate-1#2',
          ),
        ).toBe(true)
        await expect(converted(MAPPING, line.slice(0, at))).rejects.toThrow('log-1:1: found')
      }),
      { numRuns: 50 },
    )
  })

  it('of a real tracing SDK, by its own serializer, are read exactly', async () => {
    const exporter = new InMemorySpanExporter()
    const provider = new BasicTracerProvider({
      resource: resourceFromAttributes({
        [stable.ATTR_SERVICE_NAME]: 'gates',
        [incubating.ATTR_SERVICE_INSTANCE_ID]: 'gate-1',
        [incubating.ATTR_HOST_NAME]: 'quay-a',
      }),
      spanProcessors: [new SimpleSpanProcessor(exporter)],
    })
    const tracer = provider.getTracer('harbour', '1.4')
    const request = (op: string, start: number, attributes: Record<string, string | number>) =>
      tracer.startSpan(op, {
        kind: SpanKind.CLIENT,
        startTime: [1_719_864_000, start],
        attributes: {
          [stable.ATTR_DB_SYSTEM_NAME]: 'redis',
          [stable.ATTR_DB_OPERATION_NAME]: op,
          [stable.ATTR_SERVER_ADDRESS]: 'store-1',
          'app.berth': 2,
          ...attributes,
        },
      })
    const parent = tracer.startSpan('a boarding', { kind: SpanKind.SERVER })
    context.with(trace.setSpan(context.active(), parent), () => {
      request('SET', 1, { 'app.vessel': 'Alma' }).end([1_719_864_000, 999_999_999])
    })
    const failed = request('SET', 500, { 'app.vessel': 'Brisa', [stable.ATTR_ERROR_TYPE]: 'timeout' })
    failed.setStatus({ code: SpanStatusCode.ERROR, message: 'timed out' })
    failed.end([1_719_864_005, 0])
    request('HINCRBY', 700, { 'app.by': 3, 'app.berth': 'count' }).end([1_719_864_001, 1])
    parent.end()
    const spans = exporter.getFinishedSpans()
    const log = new TextDecoder().decode(JsonTraceSerializer.serializeRequest(spans)!)
    const { records } = await readable(MAPPING, log)
    expect(records).toEqual([
      {
        client: 'gate-1#1',
        op: 'write',
        key: 'berth/2',
        value: 'Alma',
        start: '1719864000000000001',
        end: '1719864000999999999',
        host: 'quay-a',
        traceId: spans[0].spanContext().traceId,
        spanId: spans[0].spanContext().spanId,
        server: 'store-1',
      },
      expect.objectContaining({
        client: 'gate-1#2',
        value: 'Brisa',
        outcome: 'unsure',
        start: '1719864000000000500',
      }),
      expect.objectContaining({ client: 'gate-1#3', op: 'increment', by: '3', end: '1719864001000000001' }),
    ])
    await provider.shutdown()
  })

  it('have their attributes by the names that the conventions publish', () => {
    // The package is generated from the semantic conventions themselves.
    const published = new Set<unknown>([...Object.values(stable), ...Object.values(incubating)])
    for (const name of [
      'db.operation.name',
      'db.operation',
      'db.query.text',
      'db.statement',
      'db.system.name',
      'db.system',
      'error.type',
      'server.address',
      'net.peer.name',
      'service.instance.id',
      'service.name',
      'host.id',
      'host.name',
    ])
      expect(published, name).toContain(name)
  })
})
