import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { Readable } from 'node:stream'
import { gzipSync } from 'node:zlib'
import { afterAll, describe, expect, it } from 'vitest'
import { fetchLines } from '../../src/history/lines.js'
import { readHistory } from '../../src/history/read.js'
import { type ByteSource, fileSource, standardInputSource } from '../../src/history/source.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-source-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))

/** Some 4 MB, so that lines span the chunks that a file is read in. */
const lines = Array.from(
  { length: 30_000 },
  (_, i) =>
    `{"client":"c${i % 7}","op":"write","key":"berth/${i % 100}","value":"vessel ${i} ${'x'.repeat(i % 90)}","start":${i},"end":${i}}`,
)
const text = `${lines.join('\n')}\n`

describe('a source of several chunks', () => {
  const cases: [string, () => Promise<ByteSource>][] = [
    [
      'a file',
      async () => {
        const path = join(folder, 'plain.ndjson')
        writeFileSync(path, text)
        return fileSource(path)
      },
    ],
    [
      'a gzip file',
      async () => {
        const path = join(folder, 'packed.ndjson.gz')
        writeFileSync(path, gzipSync(text))
        return fileSource(path)
      },
    ],
    [
      'standard input',
      async () =>
        standardInputSource(
          Readable.from([
            Buffer.from(text.slice(0, 1)),
            Buffer.from(text.slice(1, 999_999)),
            Buffer.from(text.slice(999_999)),
          ]),
        ),
    ],
    [
      'packed standard input, its first bytes one by one',
      async () => {
        const bytes = gzipSync(text)
        return standardInputSource(
          Readable.from([bytes.subarray(0, 1), bytes.subarray(1, 2), bytes.subarray(2)]),
        )
      },
    ],
  ]

  it.each(cases)('%s reads whole, and its lines are found again', async (_, open) => {
    const source = await open()
    const history = await readHistory([source])
    expect(history.count).toBe(lines.length)
    const wanted = [0, 7919, 15_000, 29_999].map((i) => ({ file: 0, line: i + 1 }))
    expect(await fetchLines([source], wanted)).toEqual(wanted.map(({ line }) => lines[line - 1]))
    expect(history.values.text(history.value[29_999])).toBe(JSON.stringify(JSON.parse(lines[29_999]).value))
  })

  it('standard input that was read in part is read on, and again from its start', async () => {
    const parts = ['one\n', 'two\nthree\n', 'four\n'].map((part) => Buffer.from(part))
    const source = standardInputSource(Readable.from(parts))
    for (const line of [1, 3, 2, 4, 1])
      expect(await fetchLines([source], [{ file: 0, line }])).toEqual([
        ['one', 'two', 'three', 'four'][line - 1],
      ])
  })
})

describe('what cannot be read', () => {
  it('is said, file by file', async () => {
    await expect(fileSource(join(folder, 'none.ndjson'))).rejects.toMatchObject({
      problems: [{ code: 'unreadable', found: 'no such file' }],
    })
    await expect(fileSource(folder)).rejects.toMatchObject({ problems: [{ code: 'not-a-file' }] })
    const path = join(folder, 'gone.ndjson')
    writeFileSync(path, text)
    const source = await fileSource(path)
    rmSync(path)
    await expect(readHistory([source])).rejects.toMatchObject({
      problems: [{ code: 'unreadable', file: path, found: 'no such file' }],
    })
  })
})
