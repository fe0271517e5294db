/** The recorders of docs/recorders for other languages, run for real where their tools are. */
import { execFileSync, spawnSync } from 'node:child_process'
import { copyFileSync, mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join, resolve } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { KIND_NAMES, OUTCOME_NAMES } from '../../src/history/columns.js'
import { readHistory } from '../../src/history/read.js'
import { fileSource } from '../../src/history/source.js'
import { misread } from '../cli/in-process.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-languages-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))
const has = (tool: string, ...args: string[]): boolean => spawnSync(tool, args).status === 0

/** Runs a language's driver, which records into `out`. Throws when it fails. */
type Drive = (out: string, work: string) => void

const python: Drive = (out) =>
  void execFileSync('python3', ['-B', 'tests/recorder/languages/drive.py', 'docs/recorders', out])

const go: Drive = (out, work) => {
  mkdirSync(join(work, 'recorder'))
  copyFileSync('docs/recorders/recorder.go', join(work, 'recorder', 'recorder.go'))
  copyFileSync('tests/recorder/languages/drive.go', join(work, 'drive.go'))
  writeFileSync(join(work, 'go.mod'), 'module drive\n\ngo 1.20\n')
  const env = { ...process.env, GOFLAGS: '-mod=mod', GOTOOLCHAIN: 'local' }
  execFileSync('go', ['vet', './...'], { cwd: work, env })
  execFileSync('go', ['run', '.', resolve(out)], { cwd: work, env })
}

const java: Drive = (out, work) => {
  const files = ['docs/recorders/Recorder.java', 'tests/recorder/languages/Drive.java']
  execFileSync('javac', ['--release', '17', '-Xlint:all,-serial', '-Werror', '-d', work, ...files])
  execFileSync('java', ['-cp', work, 'Drive', out])
}

const languages: [name: string, tools: string, present: boolean, drive: Drive][] = [
  ['recorder.py', 'python3', has('python3', '--version'), python],
  ['recorder.go', 'go', has('go', 'version'), go],
  ['Recorder.java', 'javac', has('javac', '-version') && has('java', '-version'), java],
]

describe.each(languages)('%s (skipped where there is no %s)', (name, _tools, present, drive) => {
  it.skipIf(!present)('records what this library records, exactly', { timeout: 180_000 }, async () => {
    const work = join(folder, name)
    mkdirSync(work)
    const out = join(work, 'out.ndjson')
    drive(out, work)

    const history = await readHistory([await fileSource(out)])
    expect(history.title).toBe('drive')
    expect(history.clockErrorNs).toBe(1000n)
    expect(history.hosts.size).toBe(1)
    expect(history.clients.size).toBe(6)
    expect(history.marks.map(({ text, startNs, endNs }) => [text, endNs > startNs])).toEqual([
      ['node "4" stopped', true],
      ['never over', false],
    ])
    expect(history.count).toBe(4 * 25 * 3 + 14)

    // The wall clock, to a minute: stamps of another unit or epoch would be far off.
    const now = BigInt(Date.now()) * 1_000_000n
    const start = BigInt(/"start":([0-9]+)/.exec(readFileSync(out, 'utf8'))![1])
    expect(start < now && now - start < 60_000_000_000n).toBe(true)

    const told: string[] = []
    for (let i = 0; i < history.count; i++) {
      const client = history.clients.name(history.client[i])
      expect(client).toMatch(/^(gate-[0-3]|desk|late)@[0-9a-z]+$/)
      const key = history.keys.name(history.key[i])
      if (client.startsWith('gate')) expect(OUTCOME_NAMES[history.outcome[i]]).toBe('acked')
      else told.push(`${KIND_NAMES[history.kind[i]]} ${key} ${OUTCOME_NAMES[history.outcome[i]]}`)
    }
    expect(told).toEqual([
      'write big acked',
      'read big acked',
      'write tricky acked',
      'read tricky acked',
      'write lease acked',
      'cas lease acked',
      'cas lease acked',
      'delete lease acked',
      'read lease acked',
      'increment waiting acked',
      'write lease refused',
      'write lease unsure',
      'read raw unsure',
      'write late unsure',
    ])
    const of = (key: string): number[] =>
      Array.from({ length: history.count }, (_, i) => i).filter(
        (i) => history.keys.name(history.key[i]) === key,
      )
    const text = (i: number): string => history.values.text(history.value[i])
    expect(of('big').map(text)).toEqual(Array(2).fill('18446744073709551615'))
    for (const i of of('tricky')) expect(JSON.parse(text(i))).toBe('"\\\u0001\n\u00e9\u{1d11e}')
    expect(history.values.text(history.extra[of('lease')[0]])).toBe('null')
    expect(history.values.text(history.saw![of('lease')[2]])).toBe('"b"')
    // Counts returned by 100 increments of two, each once.
    const counts = of('boarded').map((i) => Number(text(i)))
    expect(counts.sort((a, b) => a - b)).toEqual(Array.from({ length: 100 }, (_, i) => 2 * (i + 1)))

    const { status, out: report } = await misread(['check', out, '--keys', 'b*', '--keys', 'b*/*'])
    expect(status, report).toBe(0)
  })
})
