import { describe, expect, it } from 'vitest'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { chunked, converted, readable, refusal } from './converting.js'

const MAPPING = `mapping: 1
format: ndjson
unit: s
client: who.name
op: call
key: "{table}/{id}"
value: value
start: at
end: done
outcome: [{field: ok, equals: true, outcome: acked}]
`
const LOG = `{"who":{"name":"gate-1"},"call":"write","table":"berth","id":2,"value":"Alma","at":1.000000001,"done":2,"ok":true}\n`

describe('foreign NDJSON', () => {
  it('becomes operations whose numbers keep their digits', async () => {
    const value = '{"tons":9007199254740993,"draught":3.10}'
    const { text } = await readable(
      MAPPING,
      LOG.replace('"Alma"', value).replace('"id":2', '"id":18446744073709551616'),
    )
    expect(text.split('\n')[1]).toBe(
      `{"client":"gate-1","op":"write","key":"berth/18446744073709551616","value":${value},"start":1000000001,"end":2000000000}`,
    )
  })

  it('is read alike in whatever chunks it comes, with blank lines and line ends of any kind', async () => {
    const log = `${LOG}\n${LOG.replace('"Alma"', '"Fähre ⛴"')}`
    const { text } = await converted(MAPPING, log)
    for (const size of [1, 5]) expect((await converted(MAPPING, chunked('log-1', log, size))).text).toBe(text)
    expect((await converted(MAPPING, log.replaceAll('\n', '\r\n'))).text).toBe(text)
  })

  it('has fields by dotted path, JSON Pointer, and by names that hold dots', async () => {
    const log = LOG.replace(
      '"who":{"name":"gate-1"}',
      '"who.name":"gate-1","a/b":[{"c~d":"x"}],"a":{"b.c":{"d":"y"}}',
    )
    const mapping = `${MAPPING}keep: {first: /a~1b/0/c~0d, second: a.b.c.d, third: a/b.0.c~d, none: a.b.d}\n`
    const { records } = await readable(mapping, log)
    expect(records[0]).toMatchObject({ client: 'gate-1', first: 'x', second: 'y', third: 'x' })
    expect(records[0]).not.toHaveProperty('none')
  })

  it('may be kept whole, with its place', async () => {
    const { records } = await readable(`${MAPPING}keep: all\nplace: from\n`, LOG)
    expect(records[0]).toMatchObject({ source: { who: { name: 'gate-1' }, ok: true }, from: 'log-1:1' })
  })

  it('takes what is missing for a default only where the mapping gives one', async () => {
    const log = LOG.replace('"write"', '"read"').replace('"value":"Alma",', '')
    expect(await refusal(MAPPING, log)).toEqual([
      'log-1:1: found a read, and no value, expected the value that it returned; name it in the mapping; where it was absent, default: null',
    ])
    const mapping = MAPPING.replace('value: value', 'value: {field: [seen, value], default: null}')
    expect((await readable(mapping, log)).records[0].value).toBe(null)
  })

  it('converts values as told', async () => {
    const as = async (how: string, value: string): Promise<unknown> => {
      const mapping = MAPPING.replace('value: value', `value: {field: value, ${how}}`)
      return (await readable(mapping, LOG.replace('"Alma"', value))).text.match(/"value":(.*),"start"/)![1]
    }
    expect(await as('as: string', '1.50')).toBe('"1.50"')
    expect(await as('as: string', 'null')).toBe('null')
    expect(await as('as: number', '"1.50"')).toBe('1.50')
    expect(await as('as: json', '"[1.50]"')).toBe('[1.50]')
    expect(await as('as: unchanged', '{"a":[]}')).toBe('{"a":[]}')
    expect(await as('match: "^v=(.*)$"', '"v=Alma"')).toBe('"Alma"')
    expect(await as('match: "^v=([0-9]+)$", as: number', '"v=7"')).toBe('7')
    expect(await as('translate: {none: null, "7": 18446744073709551615}', '7')).toBe('18446744073709551615')
    await expect(as('as: number', '"007"')).rejects.toThrow(
      'found "007", expected a number as JSON writes it',
    )
    await expect(as('as: json', '"{"')).rejects.toThrow('expected a text that holds JSON')
    await expect(as('as: string', '[]')).rejects.toThrow('found an array')
    await expect(as('match: "^v=(.*)$"', '"Alma"')).rejects.toThrow('found a write, and "Alma"')
  })

  it('has outcome rules tried in order, numbers by their exact value', async () => {
    const rules = `outcome:
  - {all: [{field: code, equals: 9007199254740993}, {field: ok, present: true}], outcome: refused}
  - {field: code, in: [200, "OK"], outcome: acked}
  - {field: ok, equals: null, outcome: acked}
`
    const mapping = MAPPING.replace(/outcome: .*\n/, rules)
    const outcome = async (members: string): Promise<unknown> =>
      (await readable(mapping, LOG.replace('"ok":true', members))).records[0].outcome ?? 'acked'
    expect(await outcome('"ok":1,"code":9007199254740993')).toBe('refused')
    expect(await outcome('"ok":1,"code":9007199254740992')).toBe('unsure')
    expect(await outcome('"code":9007199254740993')).toBe('unsure')
    expect(await outcome('"code":2e2')).toBe('acked')
    expect(await outcome('"code":"OK"')).toBe('acked')
    expect(await outcome('"ok":null')).toBe('acked')
    expect(await outcome('"ok":{"deep":1}')).toBe('unsure')
  })

  it('does not take a field that is not there, or no text, for a match of any pattern', async () => {
    const mapping = MAPPING.replace('equals: true', 'matches: ".*"')
    for (const [members, outcome] of [
      ['"ok":"yes"', undefined],
      ['"ok":""', undefined],
      ['"no":1', 'unsure'],
      ['"ok":[]', 'unsure'],
      ['"ok":null', 'unsure'],
    ])
      expect((await readable(mapping, LOG.replace('"ok":true', members!))).records[0].outcome, members).toBe(
        outcome,
      )
  })

  it('gives an increment the count that it returned only where it was acked', async () => {
    const mapping = `${MAPPING.replace('value: value', 'value: {increment: value}')}by: {constant: 2}\n`
    const log = LOG.replace('"write"', '"increment"').replace('"Alma"', '7')
    expect((await readable(mapping, log)).records[0]).toMatchObject({ by: '2', value: '7' })
    const failed = await readable(mapping, log.replace('true', 'false'))
    expect(failed.records[0]).toMatchObject({ by: '2', outcome: 'unsure' })
    expect(failed.records[0]).not.toHaveProperty('value')
  })

  it('has marks and records to pass over told from operations', async () => {
    const mapping = `${MAPPING}skip: [{field: call, equals: ping}]
marks: [{when: {field: event, present: true}, mark: "{event} on {node}", start: at, end: {field: until, unit: iso}}]
`
    const log = `{"call":"ping"}\n{"event":"power cut","node":4,"at":1,"until":"1970-01-01T00:00:03Z"}\n{"event":"calm","node":5,"at":5}\n${LOG}`
    const { records, conversion } = await readable(mapping, log)
    expect(records.slice(0, 2)).toEqual([
      { mark: 'power cut on 4', start: '1000000000', end: '3000000000' },
      { mark: 'calm on 5', start: '5000000000' },
    ])
    expect(conversion).toMatchObject({ marks: 2, skipped: 1 })
  })

  it('has a header by the mapping, exact', async () => {
    const mapping = `${MAPPING}header: {title: drill, clockError: 1.5ms, initial: {berth/2: 9007199254740993}, initialUnknown: true}\n`
    const { text } = await readable(mapping, LOG)
    expect(text.split('\n')[0]).toBe(
      '{"history":1,"title":"drill","clockError":1500000,"initial":{"berth/2":9007199254740993},"initialUnknown":true}',
    )
  })

  it('has clients whose requests overlap split into lanes on one clock', async () => {
    const log = [1, 1.5, 3]
      .map((at) => LOG.replace('1.000000001', String(at)).replace('"done":2', `"done":${at + 1}`))
      .join('')
    const plain = await converted(MAPPING, log)
    await expect(readHistory([textSource('plain', plain.text)])).rejects.toThrow(
      'one request at a time a client',
    )
    const { records, conversion } = await readable(
      MAPPING.replace('who.name', '{field: who.name, lanes: true}'),
      log,
    )
    expect(records.map(({ client, host }) => [client, host])).toEqual([
      ['gate-1#1', 'gate-1'],
      ['gate-1#2', 'gate-1'],
      ['gate-1#2', 'gate-1'],
    ])
    expect(conversion.mostLanes).toBe(2)
  })

  it.each([
    ['{"a":1', 'log-1:2:7: found the end of the line, expected a comma or the end of the object'],
    ['{"a":01}', 'log-1:2:7: found "1}", expected a comma or the end of the object'],
    ['{"ä":1,"ä":2}', 'log-1:2:9: found'],
    ['[1]', 'log-1:2: found "[1]", expected a JSON object a line'],
    [
      LOG.replace('"write"', '"wrte"').trim(),
      'found the op "wrte", expected read, write, increment, cas, delete; did you mean write?',
    ],
    [LOG.replace('{"name":"gate-1"}', '[]').trim(), 'log-1:2: found no who.name, expected client'],
    [LOG.replace('"id":2', '"id":null').trim(), 'log-1:2: found null as id, expected key'],
    [
      LOG.replace('"id":2', '"id":{}').trim(),
      'expected text or a number as id; name the member in it that is meant',
    ],
    [LOG.replace('"gate-1"', '{}').trim(), 'found "{}" as client, expected text or a number'],
    [LOG.replace('1.000000001', 'null').trim(), 'log-1:2: found no at, expected the start'],
    [LOG.replace('1.000000001', '9e18').trim(), 'expected times within 2^63 ns of 1970; check the unit'],
  ])('refuses %s', async (line, message) => {
    expect((await refusal(MAPPING, `${LOG}${line}\n`)).join('\n')).toContain(message)
  })

  it('sets a torn last line aside with a warning', async () => {
    const { records, conversion } = await readable(MAPPING, `${LOG}{"who":{"na`)
    expect(records).toHaveLength(1)
    expect(conversion.warnings).toMatchObject([{ file: 'log-1', line: 2 }])
  })
})
