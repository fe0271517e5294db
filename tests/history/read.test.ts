import { Readable } from 'node:stream'
import { gzipSync } from 'node:zlib'
import { describe, expect, it } from 'vitest'
import { ACKED, type History, REFUSED, UNSURE } from '../../src/history/columns.js'
import { InputError, type InputProblem } from '../../src/history/problems.js'
import { readHistory, readTolerantly } from '../../src/history/read.js'
import { type ByteSource, standardInputSource, textSource } from '../../src/history/source.js'

const OP = '{"client":"a","op":"write","key":"k","value":1,"start":1,"end":2}'
const read = (...texts: string[]): Promise<History> =>
  readHistory(texts.map((text, i) => textSource(`f${i}`, text)))

async function problemsOf(...texts: string[]): Promise<readonly InputProblem[]> {
  try {
    await read(...texts)
  } catch (error) {
    if (error instanceof InputError) return error.problems
    throw error
  }
  return []
}

/** Delivers a text in pieces of the given sizes. */
function pieces(text: string | Uint8Array, size: number): ByteSource {
  const bytes = typeof text === 'string' ? new TextEncoder().encode(text) : text
  return {
    name: 'pieces',
    async *chunks() {
      for (let at = 0; at < bytes.length; at += size) yield bytes.subarray(at, at + size)
    },
  }
}

/** The same, unpacked where it is gzip. */
function unpacked(bytes: Uint8Array, size: number): ByteSource {
  return standardInputSource(Readable.from(pieces(bytes, size).chunks()))
}

const line = (fields: string): string => `{"client":"a","key":"k","start":1,"end":2,${fields}}`

describe('what is an input error', () => {
  const CASES: [what: string, text: string, code: string, column?: number][] = [
    ['not JSON', 'client=a', 'not-json', 1],
    ['a comma too many', '{"client":"a",}', 'not-json', 15],
    ['an array', '[1]', 'not-json', 1],
    ['two records on a line', `${OP}${OP}`, 'not-json', OP.length + 1],
    ['a leading zero', line('"op":"write","value":01'), 'not-json'],
    ['a raw control character', line('"op":"write","value":"\t"'), 'not-json'],
    ['an unknown escape', line('"op":"write","value":"\\x"'), 'not-json'],
    ['a member twice', line('"op":"delete","op":"read"'), 'duplicate-member'],
    ['an unknown member twice', line('"op":"delete","x":1,"x":2'), 'duplicate-member'],
    ['a member twice, once escaped', line('"op":"delete","\\u006fp":"read"'), 'duplicate-member'],
    ['a member twice inside a value', line('"op":"write","value":{"x":1,"x":2}'), 'duplicate-member', 64],
    ['an unknown op', line('"op":"put"'), 'unknown-op'],
    ['an unknown outcome', line('"op":"delete","outcome":"ok"'), 'unknown-outcome'],
    ['no client', '{"op":"delete","key":"k","start":1,"end":2}', 'missing-field'],
    [
      'a client that is a number',
      '{"client":1,"op":"delete","key":"k","start":1,"end":2}',
      'ill-typed-field',
      11,
    ],
    ['no key', '{"client":"a","op":"delete","start":1,"end":2}', 'missing-field'],
    ['no start', '{"client":"a","op":"delete","key":"k","end":2}', 'missing-field'],
    ['a write without value', line('"op":"write"'), 'missing-field'],
    ['an acked read without value', line('"op":"read"'), 'missing-field'],
    ['a cas without expect', line('"op":"cas","value":1'), 'missing-field'],
    ['applied that is no boolean', line('"op":"cas","expect":1,"value":2,"applied":"no"'), 'ill-typed-field'],
    ['end before start', '{"client":"a","op":"delete","key":"k","start":3,"end":2}', 'end-before-start', 55],
    [
      'a time finer than a nanosecond',
      '{"client":"a","op":"delete","key":"k","start":1.5,"end":2}',
      'too-fine',
      47,
    ],
    [
      'a time out of range',
      '{"client":"a","op":"delete","key":"k","start":9223372036854775808,"end":2}',
      'time-out-of-range',
    ],
    [
      'a time with a huge exponent',
      '{"client":"a","op":"delete","key":"k","start":1e999999,"end":2}',
      'time-out-of-range',
    ],
    [
      'a time that is no number',
      '{"client":"a","op":"delete","key":"k","start":"noon","end":2}',
      'ill-typed-field',
    ],
    ['a step that is not whole', line('"op":"increment","by":1.5'), 'by-not-whole'],
    ['acked without an end', '{"client":"a","op":"delete","key":"k","start":1,"outcome":"acked"}', 'no-end'],
    ['a record of no kind', '{"hello":1}', 'unknown-record'],
    ['a NUL byte', `${OP.slice(0, -1)},"x":"\0"}`, 'nul-byte'],
    ['a header of another version', '{"history":2}', 'unknown-version', 12],
    ['a header of an unknown unit', '{"history":1,"unit":"min"}', 'unknown-unit'],
    [
      'nesting beyond all reason',
      line(`"op":"write","value":${'['.repeat(600)}${']'.repeat(600)}`),
      'too-deep',
    ],
    ['a close without its open', '{"id":"x","end":3}', 'close-without-open'],
  ]

  it.each(CASES)('%s', async (_, text, code, column) => {
    const [problem] = await problemsOf(`${text}\n`)
    expect(problem).toMatchObject({ code, file: 'f0', line: 1, ...(column === undefined ? {} : { column }) })
    expect(problem.found).not.toBe('')
    expect(problem.expected).not.toBe('')
  })

  it('a header that is not the first record', async () => {
    expect(await problemsOf(`${OP}\n{"history":1}\n`)).toMatchObject([{ code: 'misplaced-header', line: 2 }])
  })

  it('names the likely unit of a time out of range', async () => {
    const [problem] = await problemsOf(
      '{"history":1,"unit":"s"}\n{"client":"a","op":"delete","key":"k","start":1719830000123,"end":1719830000124}\n',
    )
    expect(problem.code).toBe('time-out-of-range')
    expect(problem.advice).toContain('"unit":"ms"')
  })

  it('headers that contradict each other', async () => {
    const head = (value: number): string =>
      `{"history":1,"initial":{"k":${value}}}\n${OP.replace('"a"', `"c${value}"`)}\n`
    expect(await problemsOf(head(1), head(2))).toMatchObject([
      { code: 'contradicting-headers', file: 'f1', line: 1 },
    ])
    expect(await problemsOf(head(1), head(1).replace('"c1"', '"c2"').replace('1}', '1.0}'))).toEqual([])
  })

  it('operations of one client that overlap, with the advice to name each requester', async () => {
    const [problem] = await problemsOf(
      '{"client":"a","op":"delete","key":"k","start":1,"end":5}\n{"client":"a","op":"delete","key":"j","start":4,"end":6}\n',
    )
    expect(problem).toMatchObject({ code: 'overlapping-operations', line: 2 })
    expect(problem.advice).toContain('name of its own')
  })

  it('an operation after one that never ended', async () => {
    const problems = await problemsOf(
      '{"client":"a","op":"delete","key":"k","start":1}\n{"client":"a","op":"delete","key":"k","start":4,"end":6}\n',
    )
    expect(problems).toMatchObject([{ code: 'operation-after-open-end', line: 2 }])
  })

  it('an id used twice, or closed twice', async () => {
    const open = (client: string): string =>
      `{"id":"x","client":"${client}","op":"delete","key":"k","start":1}\n`
    expect(await problemsOf(open('a') + open('b'))).toMatchObject([{ code: 'misused-id', line: 2 }])
    const close = '{"id":"x","end":3}\n'
    expect(await problemsOf(open('a') + close + close)).toMatchObject([{ code: 'misused-id', line: 3 }])
  })

  it('a string that spells a number on a counter, also as initial value', async () => {
    const increment = '{"client":"a","op":"increment","key":"k","start":1,"end":2}\n'
    expect(
      await problemsOf(`${increment}{"client":"a","op":"read","key":"k","value":"1","start":3,"end":4}\n`),
    ).toMatchObject([{ code: 'number-as-string', line: 2 }])
    expect(await problemsOf(`{"history":1,"initial":{"k":"7"}}\n${increment}`)).toMatchObject([
      { code: 'number-as-string' },
    ])
  })

  it('invalid UTF-8, wherever it stands', async () => {
    const bytes = new TextEncoder().encode(`${line('"op":"write","value":"xy"')}\n`)
    bytes[bytes.indexOf(0x79)] = 0xff
    await expect(readHistory([textSource('f', bytes)])).rejects.toMatchObject({
      problems: [{ code: 'invalid-utf-8', line: 1 }],
    })
  })

  it('a line of over 16 MiB', async () => {
    const long = `${line(`"op":"write","value":"${'x'.repeat(17 << 20)}"`)}\n${OP}\n`
    expect(await problemsOf(long)).toMatchObject([{ code: 'line-too-long', line: 1 }])
  })

  it('a gzip stream that is cut short', async () => {
    const packed = gzipSync(`${OP}\n`.repeat(1))
    await expect(readHistory([textSource('f', packed.subarray(0, packed.length - 6))])).rejects.toMatchObject(
      {
        problems: [{ code: 'gzip-cut-short', file: 'f' }],
      },
    )
  })

  it('what stands behind the padding of a gzip stream, which unpacking would pass over', async () => {
    const other = OP.replace('"a"', '"b"')
    const parts = [gzipSync(`${OP}\n`), Buffer.alloc(9), gzipSync(`${other}\n`)]
    const packed = Buffer.concat(parts)
    for (let size = 1; size <= packed.length; size++) {
      await expect(readHistory([unpacked(packed, size)]), `chunks of ${size}`).rejects.toMatchObject({
        problems: [{ code: 'bad-gzip', file: '-', line: 2 }],
      })
    }
    expect((await readHistory([textSource('f', Buffer.concat(parts.slice(0, 2)))])).count).toBe(1)
    const joined = Buffer.concat([parts[0], parts[2]])
    for (let size = 1; size <= joined.length; size++)
      expect((await readHistory([unpacked(joined, size)])).count, `chunks of ${size}`).toBe(2)
  })

  it('a gzip stream cut short, on the line where it ends, beside what is wrong before it and elsewhere', async () => {
    const packed = gzipSync(`${OP}\nnonsense\n`)
    const { history, problems } = await readTolerantly([
      textSource('f', packed.subarray(0, packed.length - 8)),
      textSource('g', `${OP.replace('"a"', '"b"')}\nnonsense\n`),
    ])
    expect(history.count).toBe(2)
    expect(problems).toMatchObject([
      { code: 'not-json', file: 'f', line: 2 },
      { code: 'gzip-cut-short', file: 'f', line: 3 },
      { code: 'not-json', file: 'g', line: 2 },
    ])
  })

  it('every cut of a gzip stream', async () => {
    const packed = gzipSync(`${OP}\n${OP.replace('"a"', '"b"')}\n`)
    for (let end = 3; end < packed.length; end++) {
      await expect(
        readHistory([textSource('f', packed.subarray(0, end))]),
        `at ${end}`,
      ).rejects.toMatchObject({
        problems: [{ code: 'gzip-cut-short' }],
      })
    }
  })

  it('an initial value that is a string of a number, in the header that states it', async () => {
    const increment = '{"client":"b","op":"increment","key":"n","start":1,"end":2}'
    expect(await problemsOf(`${OP}\n`, `\n{"history":1,"initial":{"n":"7"}}\n${increment}\n`)).toMatchObject([
      { code: 'number-as-string', file: 'f1', line: 2 },
    ])
  })

  it('a last line without its end that is whole JSON and yet no good record', async () => {
    for (const [last, code] of [
      ['{"client":"b","op":"delete","op":"delete","key":"k","start":1,"end":2}', 'duplicate-member'],
      ['{"client":"b","op":"delete","start":1,"end":2}', 'missing-field'],
      [line(`"op":"write","value":${'['.repeat(600)}${']'.repeat(600)}`), 'too-deep'],
      ['12', 'not-json'],
    ])
      expect(await problemsOf(`${OP}\n${last}`), last).toMatchObject([{ code, line: 2 }])
  })

  it('an id of an operation that has its end, closed elsewhere: one error', async () => {
    expect(await problemsOf(`{"id":"x","end":9}\n${OP.replace('{', '{"id":"x",')}\n`)).toMatchObject([
      { code: 'misused-id', line: 2, column: 7 },
    ])
  })

  it('an empty history: a check of nothing must not pass', async () => {
    for (const text of ['', '\n', '{"history":1}\n', '{"mark":"m","start":1}\n']) {
      expect(await problemsOf(text), JSON.stringify(text)).toMatchObject([{ code: 'empty-history' }])
    }
  })

  it('names of members are compared as they read, however many there are', async () => {
    const members = Array.from({ length: 100_000 }, (_, i) => `"x${i}":0`)
    expect((await read(`${line(['"op":"delete"', ...members].join(','))}\n`)).count).toBe(1)
    for (const last of ['"x99999":0', '"x0":0', '"\\u00785":0']) {
      for (const many of [members, members.slice(0, 6), ['"\\u0079":0', '"x0":0', '"x5":0', '"x99999":0']]) {
        const unknown = [...many, last]
        const again = new Set(unknown.map((member) => JSON.stringify(JSON.parse(`{${member}}`)))).size
        expect(
          (await problemsOf(`${line(['"op":"delete"', ...unknown].join(','))}\n`)).map(({ code }) => code),
        ).toEqual(again < unknown.length ? ['duplicate-member'] : [])
      }
    }
  })

  it('stops after the first 20, and a survey counts on', async () => {
    const text = `${'nonsense\n'.repeat(30)}${OP}\n`
    expect(await problemsOf(text)).toHaveLength(20)
    const { history, problems, problemCount } = await readTolerantly([textSource('f', text)])
    expect([history.count, problems.length, problemCount]).toEqual([1, 20, 30])
  })
})

describe('values', () => {
  const same = async (a: string, b: string): Promise<boolean> => {
    const history = await read(
      `${line(`"op":"write","value":${a}`)}\n${line(`"op":"write","value":${b}`).replace('"a"', '"b"')}\n`,
    )
    return history.value[0] === history.value[1]
  }
  it.each([
    ['1', '1.0'],
    ['1', '1e0'],
    ['10e-1', '1'],
    ['-0', '0'],
    ['0e5', '0'],
    ['1e400', '10e399'],
    ['1E+2', '100'],
    ['1e0000000000000000000000000000001', '10'],
    ['0e99999999999999999999', '0'],
    [`1${'0'.repeat(49)}`, '1e49'],
    [`${'123456789'.repeat(5)}`, `${'123456789'.repeat(5)}.0`],
    [`-${'123456789'.repeat(5)}`, `-${'123456789'.repeat(5)}e0`],
    ['"a"', '"\\u0061"'],
    ['"\\/"', '"/"'],
    ['"\\ud83d\\ude00"', '"😀"'],
    ['{"a":1,"b":2}', '{ "b" : 2.0, "a" : 1 }'],
    ['[1,2]', '[ 1.0 , 2 ]'],
  ])('%s and %s are one value', async (a, b) => {
    expect(await same(a, b)).toBe(true)
  })
  it.each([
    ['9007199254740993', '9007199254740992'],
    ['18446744073709551615', '18446744073709551614'],
    ['1e400', '1e401'],
    ['0.1', '0.10000000000000001'],
    ['"1"', '1'],
    ['"\\ud800"', '"\\ufffd"'],
    ['[1,2]', '[2,1]'],
    ['{"a":1}', '{"a":1,"b":null}'],
    ['true', '"true"'],
  ])('%s and %s are two', async (a, b) => {
    expect(await same(a, b)).toBe(false)
  })

  it('long numbers take no time squared', async () => {
    const number = `1${'0'.repeat(300_000)}1`
    expect(await same(number, `${number}.0`)).toBe(true)
    expect(await same(number, `${number}.1`)).toBe(false)
  })

  it('names that would be special elsewhere are names', async () => {
    const names = ['__proto__', 'constructor', '', ' ', '\u202e', 'a/b', '\ud800']
    const history = await read(
      names
        .map(
          (name, i) =>
            `{"client":${JSON.stringify(name)},"op":"write","key":${JSON.stringify(name)},"value":{"__proto__":${i}},"start":${i},"end":${i}}\n`,
        )
        .join(''),
    )
    expect(names.map((_, i) => history.keys.name(history.key[i]))).toEqual(names)
    expect(names.map((_, i) => history.clients.name(history.client[i]))).toEqual(names)
    expect(history.values.text(history.value[3])).toBe('{"__proto__":3}')
  })
})

describe('times are exact to the nanosecond', () => {
  const timesOf = async (unit: string, start: string, end: string): Promise<[bigint, bigint]> => {
    const { times } = await read(
      `{"history":1,"unit":"${unit}"}\n{"client":"a","op":"delete","key":"k","start":${start},"end":${end}}\n`,
    )
    return [times.startNs(0), times.endNs(0)]
  }
  it.each([
    ['ns', '1719830000123456789', '"1719830000123456790"', 1719830000123456789n, 1719830000123456790n],
    ['s', '1719830000.123456789', '1719830000.12345679', 1719830000123456789n, 1719830000123456790n],
    ['ms', '1.5e3', '1500.000001', 1500000000n, 1500000001n],
    ['us', '-0.001', '0', -1n, 0n],
    ['ns', '-9223372036854775808', '9223372036854775807', -(2n ** 63n), 2n ** 63n - 1n],
  ])('%s: %s to %s', async (unit, start, end, startNs, endNs) => {
    expect(await timesOf(unit, start, end)).toEqual([startNs, endNs])
  })

  it('also when they lie years apart', async () => {
    const starts = [0n, 1n, 10n ** 16n, 5n * 10n ** 18n + 1n, -(10n ** 18n)]
    const { times } = await read(
      starts
        .map(
          (start, i) => `{"client":"c${i}","op":"delete","key":"k","start":${start},"end":${start + 7n}}\n`,
        )
        .join(''),
    )
    expect(starts.map((_, i) => [times.startNs(i), times.endNs(i)])).toEqual(
      starts.map((start) => [start, start + 7n]),
    )
    expect(times.startOffset).toBeUndefined()
  })

  it('a clock error is the largest of the headers, each in its own unit', async () => {
    const file = (client: string, unit: string, error: number): string =>
      `{"history":1,"unit":"${unit}","clockError":${error}}\n{"client":"${client}","op":"delete","key":"k","start":1,"end":2}\n`
    expect((await read(file('a', 'ms', 2), file('b', 'us', 300))).clockErrorNs).toBe(2_000_000n)
  })
})

describe('split operations', () => {
  const open = '{"id":"1","client":"a","op":"read","key":"k","start":1}\n'
  const close = '{"id":"1","end":5,"value":7}\n'

  it.each([
    ['in order', [open + close]],
    ['the close first', [close + open]],
    ['in two files', [open, close]],
    ['in two files, the close first', [close, open]],
  ])('halves %s', async (_, texts) => {
    const history = await read(...texts)
    expect(history.count).toBe(1)
    expect(history.outcome[0]).toBe(ACKED)
    expect(history.values.text(history.value[0])).toBe('7')
    expect(history.times.endNs(0)).toBe(5n)
  })

  it('each half in the unit of its own file', async () => {
    const history = await read(
      `{"history":1,"unit":"ms"}\n${open}`,
      `{"history":1,"unit":"us"}\n${close.replace('5', '5000')}`,
    )
    expect([history.times.startNs(0), history.times.endNs(0)]).toEqual([1_000_000n, 5_000_000n])
  })

  it('an open that never closes is unsure', async () => {
    const history = await read(open)
    expect([history.outcome[0], history.hasEnd[0]]).toEqual([UNSURE, 0])
  })

  it('a close carries outcome, applied and saw', async () => {
    const history = await read(
      '{"id":"1","client":"a","op":"cas","key":"k","expect":1,"value":2,"start":1}\n{"id":"1","end":2,"applied":false,"saw":3}\n{"id":"2","client":"a","op":"write","key":"k","value":9,"start":3}\n{"id":"2","end":4,"outcome":"refused"}\n',
    )
    expect(history.applied[0]).toBe(0)
    expect(history.values.text(history.saw![0])).toBe('3')
    expect(history.outcome[1]).toBe(REFUSED)
  })
})

describe('what recorders and tools do to files', () => {
  const text = `\ufeff{"history":1,"title":"tür"}\r\n\r\n${OP}\r\n{"mark":"ä","start":1}\n{"client":"b","op":"read","key":"k","value":1,"start":3,"end":4}\n`

  it('line ends, blank lines and a byte-order mark are accepted', async () => {
    const history = await read(text)
    expect([history.count, history.title, history.marks.length]).toEqual([2, 'tür', 1])
    expect(Array.from(history.line.subarray(0, 2))).toEqual([3, 5])
  })

  it('it does not matter where chunks end', async () => {
    for (let size = 1; size < 40; size++) {
      const history = await readHistory([pieces(text, size)])
      expect([history.count, history.line[1], history.keys.name(0)], `chunks of ${size}`).toEqual([2, 5, 'k'])
    }
  })

  it('nor for gzip', async () => {
    const history = await readHistory([textSource('f', gzipSync(text))])
    expect(history.count).toBe(2)
  })

  it('a last line cut short by a crash is set aside with a warning, wherever it is cut', async () => {
    const whole = `${OP}\n`
    const last = '{"client":"b","op":"write","key":"k","value":"ü","start":3,"end":4}'
    const bytes = new TextEncoder().encode(whole + last)
    const begin = new TextEncoder().encode(whole).length
    for (let end = begin + 1; end < bytes.length; end++) {
      const history = await readHistory([textSource('f', bytes.subarray(0, end))])
      expect([history.count, history.warnings.map(({ code }) => code)], `cut at ${end - begin}`).toEqual([
        1,
        ['torn-last-line'],
      ])
    }
    expect((await readHistory([textSource('f', bytes)])).count).toBe(2)
  })
})
