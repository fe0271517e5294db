import { gzipSync } from 'node:zlib'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { chunked, converted, readable, refusal } from './converting.js'

const MAPPING = `mapping: 1
format: csv
unit: ms
client: terminal
op: {field: verb, translate: {GET: read, SET: write, INC: increment, CAS: cas}}
key: berth/{berth}
value: vessel
start: sent
end: done
outcome: [{field: status, equals: ok, outcome: acked}, {field: status, equals: "no", outcome: refused}]
`
const HEAD = 'terminal,verb,berth,vessel,sent,done,status\n'
const ROW = 'gate-1,SET,2,Alma,1,2,ok\n'

describe('CSV', () => {
  it('becomes operations, with times in nanoseconds and outcomes by the rules', async () => {
    const log = `${HEAD}${ROW}gate-1,GET,2,Alma,3.000001,4,ok\ngate-1,SET,2,Brisa,5,6,no\ngate-1,SET,2,Corso,7,8,late\n`
    const { text, conversion } = await readable(MAPPING, log)
    expect(text.split('\n').slice(0, -1)).toEqual([
      '{"history":1}',
      '{"client":"gate-1","op":"write","key":"berth/2","value":"Alma","start":1000000,"end":2000000}',
      '{"client":"gate-1","op":"read","key":"berth/2","value":"Alma","start":3000001,"end":4000000}',
      '{"client":"gate-1","op":"write","key":"berth/2","value":"Brisa","start":5000000,"end":6000000,"outcome":"refused"}',
      '{"client":"gate-1","op":"write","key":"berth/2","value":"Corso","start":7000000,"end":8000000,"outcome":"unsure"}',
    ])
    expect(conversion).toMatchObject({ noRule: 1, outcomes: { acked: 2, refused: 1, unsure: 1 } })
  })

  it('is read alike in whatever chunks it comes, packed or not, with whatever line ends', async () => {
    const log = `${HEAD}gate-1,SET,2,"Alma, ""fähre""\nof 06:11 ⛴",1,2,ok\n${ROW.replace('1,2,ok', '3,4,ok')}`
    const { text } = await readable(MAPPING, log)
    expect(text).toContain('"Alma, \\"fähre\\"\\nof 06:11 ⛴"')
    for (const size of [1, 2, 3, 7])
      expect((await converted(MAPPING, chunked('log-1', log, size))).text).toBe(text)
    expect((await converted(MAPPING, gzipSync(log))).text).toBe(text)
    expect((await converted(MAPPING, `\ufeff${log}`)).text).toBe(text)
    const crlf = log.replace(/\n(?!of)/g, '\r\n')
    expect((await converted(MAPPING, crlf)).text).toBe(text)
    expect((await converted(MAPPING, `${log}\n\n`)).text).toBe(text)
  })

  it('keeps counts that no double holds', async () => {
    const mapping = MAPPING.replace('value: vessel', 'value: {field: vessel, as: number}')
    const log = `${HEAD}${ROW.replace('Alma', '18446744073709551615')}`
    expect((await readable(mapping, log)).text).toContain('"value":18446744073709551615,')
  })

  it('may hold JSON, other delimiters, comments, and no line of names', async () => {
    const mapping = MAPPING.replace('vessel', '{field: vessel, as: json}').concat(
      'csv: {delimiter: ";", comment: "#", columns: [terminal, verb, berth, vessel, sent, done, status]}\n',
    )
    const { text } = await readable(mapping, '# quay a\ngate-1;SET;2;"{""n"": 9007199254740993}";1;2;ok\n')
    expect(text).toContain('"value":{"n":9007199254740993}')
  })

  it('has an end by a duration, or a start', async () => {
    const log = `${HEAD}gate-1,SET,2,Alma,10,0.25,ok\n`
    const after = await readable(MAPPING.replace('end: done', 'duration: {field: done, unit: us}'), log)
    expect(after.records[0]).toMatchObject({ start: '10000000', end: '10000250' })
    const before = await readable(
      MAPPING.replace('start: sent', 'end: sent').replace('end: done', 'duration: done'),
      log,
    )
    expect(before.records[0]).toMatchObject({ start: '9750000', end: '10000000' })
  })

  it('has times finer than a nanosecond rounded outward where the mapping says so', async () => {
    const log = `${HEAD}gate-1,SET,2,Alma,1.0000001,1.0000001,ok\n`
    expect(await refusal(MAPPING, log)).toEqual([
      'log-1:2: found "1.0000001", expected a time in whole nanoseconds; round: true rounds so that the request lasts no shorter',
    ])
    const rounded = MAPPING.replace('sent', '{field: sent, round: true}').replace(
      'end: done',
      'end: {field: done, round: true}',
    )
    expect((await readable(rounded, log)).records[0]).toMatchObject({ start: '1000000', end: '1000001' })
    const lasting = rounded.replace('end: {', 'duration: {')
    expect((await readable(lasting, log)).records[0]).toMatchObject({ start: '1000000', end: '2000002' })
  })

  it('has a request without an end for unsure, whatever the rules say of it', async () => {
    const { records, conversion } = await readable(MAPPING, `${HEAD}gate-1,SET,2,Alma,1,,ok\n`)
    expect(records[0]).toMatchObject({ outcome: 'unsure' })
    expect(records[0]).not.toHaveProperty('end')
    expect(conversion.noEnd).toBe(1)
  })

  it('needs to be told what an empty value means', async () => {
    const log = `${HEAD}gate-1,GET,2,,1,2,ok\n`
    expect(await refusal(MAPPING, log)).toEqual([
      'log-1:2: found a read, and an empty vessel, expected the value that it returned; say what an empty cell means, empty: null (absence) or empty: text',
    ])
    const asNull = await readable(MAPPING.replace('vessel', '{field: vessel, empty: null}'), log)
    expect(asNull.records[0].value).toBe(null)
    const asText = await readable(MAPPING.replace('vessel', '{field: vessel, empty: text}'), log)
    expect(asText.records[0].value).toBe('')
  })

  it('does not take an empty cell for a match of any pattern or number', async () => {
    const mapping = MAPPING.replace('{field: status, equals: ok', '{field: status, matches: "^.+|ok$"')
    const { records } = await readable(mapping, `${HEAD}gate-1,SET,2,Alma,1,2,\n`)
    expect(records[0].outcome).toBe('unsure')
  })

  it('has increments and cas told as exactly as their meaning needs', async () => {
    const log = `${HEAD}gate-1,INC,2,3,1,2,ok\n`
    expect((await refusal(MAPPING, log))[0]).toContain('found an increment, and no by in the mapping')
    const { text } = await readable(`${MAPPING}by: vessel\n`, log)
    // A column for the values of all kinds is not taken for the count that an increment returned.
    expect(text).toContain('"by":3,"start"')
    expect((await refusal(`${MAPPING}by: berth\n`, log.replace('INC,2', 'INC,2.5')))[0]).toContain(
      '"2.5" as by',
    )

    const cas = `${HEAD}gate-1,CAS,2,Alma,1,2,ok\n`
    expect((await refusal(MAPPING, cas))[0]).toContain('found a cas, and no expect in the mapping')
    const expecting = `${MAPPING}expect: {constant: null}\n`
    expect((await refusal(expecting, cas))[0]).toContain('found a cas that was answered, and no applied')
    const failed = await readable(`${expecting}applied: {constant: false}\nsaw: terminal\n`, cas)
    expect(failed.records[0]).toMatchObject({ expect: null, applied: false, saw: 'gate-1' })
  })

  it('names the line where a record begins, and stops after twenty problems', async () => {
    const bad = 'gate-1,SET,"2\n2",Alma,2,1,ok\n'
    const found = await refusal(MAPPING, `${HEAD}${ROW}\n${bad}${'gate-1,POP,2,Alma,1,2,ok\n'.repeat(30)}`)
    expect(found).toHaveLength(20)
    expect(found[0]).toMatch(
      /^log-1:4: found an end 1000000 ns before the start, expected an end at or after/,
    )
    expect(found[1]).toMatch(/^log-1:6: found the op "POP", expected read, write, increment, cas, delete/)
    expect(found[19]).toMatch(/^log-1:24: /)
  })

  it.each([
    ['gate-1,SET,2,Alma,1,2\n', 'log-1:2: found 6 cells, expected 7, as many as columns'],
    ['gate-1,SET,2,"Alma,1,2,ok\n\n\n', 'log-1:2: found a quote that is never closed, expected its end'],
    ['gate-1,SET,2,Al"ma,1,2,ok\n', 'log-1:2: found a quote inside a cell that does not begin with one'],
    ['gate-1,SET,2,"Al"ma,1,2,ok\n', 'log-1:2: found text after a quote that closes a cell'],
    [`gate-1,SET,2,"${'x'.repeat(17 * 1024 * 1024)}`, 'log-1:2: found a record of over 16 MiB'],
    ['gate-1,SET,2,Alma,x,2,ok\n', 'log-1:2: found "x", expected a number of ms'],
    ['gate-1,SET,2,Alma,2024-07-01T00:00:00Z,2,ok\n', 'write unit: iso for timestamps such as this one'],
    ['gate-1,SET,2,Alma,1,1e30,ok\n', 'expected times within 2^63 ns of 1970; check the unit'],
    [',SET,2,Alma,1,2,ok\n', 'log-1:2: found an empty terminal, expected client'],
    ['gate-1,SET,,Alma,1,2,ok\n', 'log-1:2: found an empty berth, expected key'],
    ['gate-1,SET,2,Al\0ma,1,2,ok\n', 'log-1:2: found a NUL byte, expected text in UTF-8'],
    ['', 'log-1: found no operations, expected at least one record that is an operation'],
  ])('refuses what is no usable row, case %#', async (row, message) => {
    expect((await refusal(MAPPING, `${HEAD}${row}`)).join('\n')).toContain(message)
  })

  it('tells which line is no UTF-8', async () => {
    const log = new Uint8Array([...new TextEncoder().encode(`${HEAD}${ROW}gate-1,`), 0xff, 0x0a])
    expect(await refusal(MAPPING, log)).toEqual([
      'log-1:3: found bytes that are no UTF-8, expected text in UTF-8; convert the file to UTF-8',
    ])
  })

  it('has all columns that the mapping names, else the mapping is told where', async () => {
    expect(await refusal(MAPPING, `${HEAD.replace('vessel', 'ship').replace('sent', 'seen')}${ROW}`)).toEqual(
      [
        'map.yaml:7:8: found "vessel", which is no column of log-1, expected one of terminal, verb, berth, ship, seen, done, status',
        'map.yaml:8:8: found "sent", which is no column of log-1, expected one of terminal, verb, berth, ship, seen, done, status; did you mean seen?',
      ],
    )
    expect((await refusal(MAPPING, 'a,a\n'))[0]).toContain('found two columns named "a"')
  })

  it('names the right line whatever stands in cells and between records', async () => {
    const cell = fc.array(fc.constantFrom('a', '\n', '\r\n', '#', '""', ';'), { maxLength: 5 })
    const between = fc.array(fc.constantFrom('', '# quay "b"', '#'), { maxLength: 2 })
    const rows = fc.array(fc.tuple(between, cell), { minLength: 1, maxLength: 6 })
    const mapping = `${MAPPING}place: from\ncsv: {comment: "#"}\n`
    await fc.assert(
      fc.asyncProperty(rows, fc.constantFrom('\n', '\r\n'), fc.nat({ max: 40 }), async (rows, end, size) => {
        let log = `# head${end}${HEAD.trim()}${end}`
        const expected: string[] = []
        for (const [between, cell] of rows) {
          for (const line of between) log += line + end
          expected.push(`log:${log.split('\n').length}`)
          log += `gate-1,SET,2,"${cell.join('')}x",1,2,ok${end}`
        }
        const { records } = await converted(mapping, chunked('log', log, size + 1))
        expect(records.map(({ from }) => from)).toEqual(expected)
      }),
      { numRuns: 200 },
    )
  })

  it('writes nothing after the first problem', async () => {
    const pieces: string[] = []
    const { convert } = await import('../../src/adapters/convert.js')
    const { parseMapping } = await import('../../src/adapters/mapping-file.js')
    const log = `${HEAD}${ROW.repeat(20_000)}gate-1,SET,2,Alma,2,1,ok\n${ROW.repeat(20_000)}`
    const work = convert([chunked('log', log, 65_536)], parseMapping(MAPPING, 'm'), async (text) => {
      pieces.push(text)
    })
    await expect(work).rejects.toThrow('log:20002: found an end')
    // What came in earlier chunks went out as it streamed by.
    expect(pieces.length).toBeGreaterThan(3)
    expect(pieces.join('').split('\n').length).toBeLessThanOrEqual(20_002)

    pieces.length = 0
    const whole = convert([chunked('log', log, log.length)], parseMapping(MAPPING, 'm'), async (text) => {
      pieces.push(text)
    })
    await expect(whole).rejects.toThrow('log:20002: found an end')
    expect(pieces).toEqual([])
  })
})
