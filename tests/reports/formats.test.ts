/**
 * What a saved result becomes, read back by parsers that are not ours: CommonMark's reference parser, an XML parser.
 */
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { Parser } from 'commonmark'
import fc from 'fast-check'
import { XMLParser, XMLValidator } from 'fast-xml-parser'
import { afterAll, describe, expect, it } from 'vitest'
import { check } from '../../src/findings/check.js'
import type { Result } from '../../src/findings/result.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { parsePromise } from '../../src/promises/parse-request.js'
import { junitReport } from '../../src/reports/junit.js'
import { markdownReport } from '../../src/reports/markdown.js'
import { misread } from '../cli/in-process.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-formats-'))
afterAll(() => rmSync(folder, { recursive: true }))

/** A stale read of hostile values on a hostile key. */
async function hostile(key: string, value: string, client: string): Promise<Result> {
  const records = [
    { client, op: 'write', key, value: `${value}1`, start: 0, end: 1 },
    { client, op: 'write', key, value: `${value}2`, start: 2, end: 3 },
    { client: `${client} `, op: 'read', key, value: `${value}1`, start: 4, end: 5 },
  ]
  const source = textSource('drill.ndjson', records.map((record) => `${JSON.stringify(record)}\n`).join(''))
  const { result } = await check(await readHistory([source]), [source], {
    promises: [parsePromise('linearizable')],
  })
  return result
}

const nasty = fc.oneof(
  fc.string({ unit: 'binary', maxLength: 30 }),
  fc
    .array(
      fc.constantFrom(
        '`',
        '```',
        '|',
        '<script>',
        ']]>',
        '\u0000',
        '\u001b[31m',
        '\ud800',
        '\u202e',
        '\n',
        '\n# ',
        '[a](b)',
        '&amp;',
        '*',
        '_',
        '-',
        '>',
      ),
      { maxLength: 6 },
    )
    .map((parts) => parts.join('')),
)

/** Types of the nodes of a Markdown document, in order. */
function nodesOf(markdown: string): string[] {
  const walker = new Parser().parse(markdown).walker()
  const types: string[] = []
  for (let step = walker.next(); step; step = walker.next()) if (step.entering) types.push(step.node.type)
  return types
}

describe('Markdown', () => {
  it('is the same document whatever the input holds', async () => {
    const shape = (types: string[]): string[] =>
      types.filter((type) => !['text', 'softbreak', 'code', 'strong', 'emph'].includes(type))
    const plain = shape(nodesOf(markdownReport(await hostile('berth', 'vessel', 'gate'), { limit: 20 })))
    expect(plain.filter((type) => type === 'code_block')).toHaveLength(3)
    expect(plain.filter((type) => type === 'heading')).toHaveLength(3)
    await fc.assert(
      fc.asyncProperty(nasty, nasty, nasty, async (key, value, client) => {
        const markdown = markdownReport(await hostile(key, value, client), { limit: 20 })
        expect(shape(nodesOf(markdown)), markdown).toEqual(plain)
        // biome-ignore lint/suspicious/noControlCharactersInRegex: these are what must not get out
        expect(markdown).not.toMatch(/[\u0000-\u0008\u000b-\u001f\u007f\u202e]/)
      }),
      { numRuns: 200 },
    )
  })

  it('keeps its timelines narrow, and says how to check again', async () => {
    const { out } = await misread(['check', 'histories/harbour.ndjson', '--format', 'markdown'])
    const blocks = [...out.matchAll(/```text\n([\s\S]*?)\n```/g)].map(([, block]) => block)
    expect(blocks.length).toBeGreaterThan(5)
    for (const block of blocks)
      for (const line of block.split('\n')) expect(line.length).toBeLessThanOrEqual(76)
    expect(out).toContain('npx misread check histories/harbour.ndjson --promise linearizable')
  })
})

describe('JUnit XML', () => {
  it('is well-formed whatever the input holds, and fails for what is broken', async () => {
    await fc.assert(
      fc.asyncProperty(nasty, nasty, nasty, async (key, value, client) => {
        const xml = junitReport(await hostile(key, value, client))
        expect(XMLValidator.validate(xml), xml).toBe(true)
        const { testsuites } = new XMLParser({ ignoreAttributes: false }).parse(xml)
        expect(testsuites['@_failures']).toBe('1')
        expect(testsuites.testsuite.testcase.failure['@_type']).toBe('broken')
        // XML 1.0 has no other control characters.
        // biome-ignore lint/suspicious/noControlCharactersInRegex: these are what must not get out
        expect(xml).not.toMatch(/[\u0000-\u0008\u000b\u000c\u000e-\u001f\ud800-\udfff]/u)
      }),
      { numRuns: 200 },
    )
  })

  it('has a test case a promise: what is undecided does not pass', async () => {
    const records = [
      { op: 'write', value: 5 },
      { op: 'increment', by: 2 },
      { op: 'read', value: 7 },
    ].map((record, i) => JSON.stringify({ client: 'a', key: 'k', ...record, start: 2 * i, end: 2 * i + 1 }))
    const path = join(folder, 'mixed.ndjson')
    writeFileSync(path, `${records.join('\n')}\n`)
    const { out } = await misread(['check', path, '--budget', '1step', '--format', 'junit'])
    const { testsuites } = new XMLParser({ ignoreAttributes: false }).parse(out)
    expect([testsuites['@_tests'], testsuites['@_errors']]).toEqual(['1', '1'])
    const holds = await misread([
      'check',
      path,
      '--promise',
      'linearizable',
      '--promise',
      'coherent',
      '--format',
      'junit',
    ])
    const suites = new XMLParser({ ignoreAttributes: false }).parse(holds.out).testsuites
    expect([suites['@_tests'], suites['@_failures'], suites['@_errors']]).toEqual(['2', '0', '0'])
  })
})

describe('misread render', () => {
  it.each(['text', 'json', 'ndjson', 'markdown', 'junit'])(
    '%s of a saved result is what the check printed',
    async (format) => {
      const saved = join(folder, `${format}.json`)
      writeFileSync(saved, (await misread(['check', 'histories/harbour.ndjson', '--format', 'json'])).out)
      const { status, out } = await misread(['render', saved, '--format', format])
      expect(status).toBe(0)
      expect(out).toBe((await misread(['check', 'histories/harbour.ndjson', '--format', format])).out)
    },
  )

  it('says where a result is none', async () => {
    const path = join(folder, 'bad.json')
    writeFileSync(path, '{"result":1}')
    const { status, err } = await misread(['render', path])
    expect(status).toBe(2)
    expect(err).toMatch(/bad\.json: found at misread/)
  })
})
