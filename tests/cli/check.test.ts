import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { comparisonSchema } from '../../src/findings/compare.js'
import { FINDING_KINDS } from '../../src/findings/kinds.js'
import { resultSchema } from '../../src/findings/result.js'
import { surveySchema } from '../../src/history/survey.js'
import { storyText } from '../findings/story.js'
import { misread } from './in-process.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-cli-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))

const HARBOUR = 'histories/harbour.ndjson'
const BROKEN = storyText('A w1 | A w2 | C r1 | A w3 | C r3')
const SOUND = storyText('A w1 | C r1 | A w2 | C r2')

function file(name: string, text: string): string {
  const path = join(folder, name)
  writeFileSync(path, text)
  return path
}

describe('exit statuses', () => {
  it('0 when every promise holds', async () => {
    const { status, out, err } = await misread(['check', file('sound.ndjson', SOUND)])
    expect([status, err]).toEqual([0, ''])
    expect(out).toContain('linearizable: holds')
    expect(out).toContain('speaks of this recording, not of the store')
  })

  it('1 when one is broken', async () => {
    const { status, out } = await misread(['check', file('broken.ndjson', BROKEN)])
    expect(status).toBe(1)
    expect(out).toContain('stale-read')
  })

  it('2 for unusable input, with file, line and column', async () => {
    const path = file('bad.ndjson', `${SOUND}{"client":\n`)
    const { status, out, err } = await misread(['check', path])
    expect([status, out]).toEqual([2, ''])
    expect(err).toMatch(/^error: .*bad\.ndjson:6:11: found the end of the line, expected a JSON value/)
  })

  it('3 when nothing is broken and something undecided', async () => {
    const records = [
      { op: 'write', value: 5 },
      { op: 'increment', by: 2 },
      { op: 'read', value: 7 },
    ]
    const mixed = records.map((record, i) =>
      JSON.stringify({ client: 'gate-1', key: 'sailing/3', ...record, start: 2 * i, end: 2 * i + 1 }),
    )
    const path = file('mixed.ndjson', `${mixed.join('\n')}\n`)
    const { status, out } = await misread(['check', path, '--budget', '1step'])
    expect(status).toBe(3)
    expect(out).toContain('it mixes increments with writes, cas or deletes, and the search met its budget')
    expect((await misread(['check', path])).status).toBe(0)
    expect((await misread(['check', path, '--budget', '3 parsecs'])).err).toContain('Expected a duration')
  })

  it('130 when it is stopped, with what was found till then', async () => {
    const controller = new AbortController()
    controller.abort()
    const { status, out } = await misread(['check', HARBOUR], { signal: controller.signal })
    expect(status).toBe(130)
    expect(out).toContain('interrupted')
  })

  it.each([
    [['check', 'no-such-file.ndjson'], 'no such file'],
    [['check', 'src'], 'a folder'],
    [['check'], 'missing required argument'],
    [['chek', 'x'], 'Did you mean check?'],
    [['check', HARBOUR, '--promise', 'linearisable'], 'did you mean linearizable?'],
    [['check', HARBOUR, '--promise', 'durable within=2s'], 'has no parameter "within"; it takes settle'],
    [['check', HARBOUR, '--promise', 'bounded-staleness'], 'needs within or versions'],
    [['check', HARBOUR, '--promise', 'regular', '--promise', 'regular'], 'is asked for twice'],
    [['check', HARBOUR, '--keys', 'berths/*'], 'no key matches "berths/*"'],
    [['check', HARBOUR, '--clock-error', 'two'], 'Expected a duration'],
    [['check', HARBOUR, '--format', 'jsn'], 'did you mean json?'],
    [['check', HARBOUR, HARBOUR], 'named twice'],
    [['check', HARBOUR, '--frmat', 'json'], 'Did you mean --format?'],
  ])('2 for %j', async (args, message) => {
    const { status, err } = await misread(args)
    expect(status).toBe(2)
    expect(err).toContain(message)
  })
})

describe('the harbour demo', () => {
  it('has one of each finding that linearizable can show', async () => {
    const { out, status } = await misread(['check', HARBOUR, '--format', 'json'])
    const result = resultSchema.parse(JSON.parse(out))
    expect(status).toBe(1)
    const kinds = result.findings.map(({ kind }) => kind)
    expect([...kinds].sort()).toEqual(FINDING_KINDS.filter((kind) => kind !== 'causal-inversion').sort())
  })

  it('is what its script writes', async () => {
    const { execFileSync } = await import('node:child_process')
    const made = execFileSync('npx', ['tsx', 'histories/make-harbour.ts'], { encoding: 'utf8' })
    expect(readFileSync(HARBOUR, 'utf8')).toBe(made)
  })
})

describe('the real recordings', () => {
  it('reads from a Redis replica were stale: broken', async () => {
    const { status, out } = await misread(['check', 'histories/redis-replica.ndjson.gz', '--format', 'json'])
    const result = resultSchema.parse(JSON.parse(out))
    expect(status).toBe(1)
    expect(result.findingCounts['stale-read']).toBeGreaterThan(0)
    expect(result.promises[0].undecided).toBe(0)
  })

  it('everything through the primary: holds', async () => {
    expect((await misread(['check', 'histories/redis-primary.ndjson.gz'])).status).toBe(0)
  })
})

describe('check options', () => {
  it('standard input is read for -', async () => {
    const { status, out } = await misread(['check', '-'], { input: BROKEN })
    expect(status).toBe(1)
    expect(out).toContain('-:4')
  })

  it('--keys checks only what matches, * not across /', async () => {
    const { out } = await misread(['check', HARBOUR, '--keys', 'berth/*', '--format', 'json', '--every-key'])
    const { keys } = resultSchema.parse(JSON.parse(out))
    expect(keys.map(({ key }) => key).sort()).toEqual(Array.from({ length: 9 }, (_, i) => `berth/${i + 1}`))
    expect((await misread(['check', HARBOUR, '--keys', '*'])).status).toBe(2)
  })

  it('--clock-error replaces what the headers say, and a large one explains the stale read away', async () => {
    const path = file('broken.ndjson', BROKEN)
    expect((await misread(['check', path, '--clock-error', '2ns'])).status).toBe(1)
    expect((await misread(['check', path, '--clock-error', '1us'])).status).toBe(0)
  })

  it('several promises are decided in one run, each by its name', async () => {
    const { out } = await misread([
      'check',
      HARBOUR,
      '--format',
      'json',
      '--promise',
      'read-your-writes',
      '--promise',
      'bounded-staleness within=1s',
    ])
    const { promises } = resultSchema.parse(JSON.parse(out))
    expect(promises.map(({ name, promise, parameters }) => [name, promise, parameters])).toEqual([
      ['read-your-writes', 'read-your-writes', {}],
      ['bounded-staleness within=1s', 'bounded-staleness', { within: '1s' }],
    ])
  })

  it('--limit bounds the text, not the counts', async () => {
    const { out } = await misread(['check', HARBOUR, '--limit', '2'])
    expect(out).toContain('15 findings')
    expect(out).toContain('13 more findings not shown')
  })

  it('--format ndjson writes the findings alone', async () => {
    const { out } = await misread(['check', HARBOUR, '--format', 'ndjson'])
    expect(
      out
        .trimEnd()
        .split('\n')
        .map((line) => JSON.parse(line).id),
    ).toEqual(Array.from({ length: 15 }, (_, i) => i + 1))
  })

  it('--out writes result, report and counterexamples, each a history that is broken alone', async () => {
    const out = join(folder, 'findings')
    const { status } = await misread(['check', HARBOUR, '--out', out])
    expect(status).toBe(1)
    const result = resultSchema.parse(JSON.parse(readFileSync(join(out, 'result.json'), 'utf8')))
    expect(result.inputs[0].sha256).toMatch(/^[0-9a-f]{64}$/)
    expect(readFileSync(join(out, 'report.txt'), 'utf8')).toContain('lost-write')
    const files = readdirSync(join(out, 'counterexamples')).sort()
    expect(files).toEqual(result.findings.map(({ counterexample }) => counterexample!.split('/')[1]).sort())
    for (const name of files) {
      expect((await misread(['check', join(out, 'counterexamples', name)])).status, name).toBe(1)
    }
  })

  it('--out writes a counterexample for each finding that the text shows', async () => {
    const { out } = await misread(['check', HARBOUR, '--limit', '4', '--out', join(folder, 'four')])
    const shown = [...out.matchAll(/^\[(\d+)\]/gm)].map(([, id]) => id.padStart(4, '0')).sort()
    expect(shown).toHaveLength(4)
    expect(
      readdirSync(join(folder, 'four', 'counterexamples'))
        .map((name) => name.slice(0, 4))
        .sort(),
    ).toEqual(shown)
  })

  it('--out does not write over what is there without --force', async () => {
    const out = join(folder, 'kept')
    await misread(['check', HARBOUR, '--out', out])
    expect((await misread(['check', HARBOUR, '--out', out])).err).toContain('--force')
    expect((await misread(['check', HARBOUR, '--out', out, '--force', '--limit', '1'])).status).toBe(1)
    expect(readdirSync(join(out, 'counterexamples'))).toHaveLength(1)
  })
})

describe('a promises file', () => {
  const promises = file(
    'promises.yaml',
    'promises:\n  - name: gates\n    keys: "berth/*"\n    promise: read-your-writes\n  - name: counts\n    keys: "sailing/*/boarded"\n    promise: linearizable\n',
  )

  it('is checked promise by promise, each on its keys, and does not add linearizable', async () => {
    const { out, status } = await misread(['check', HARBOUR, '--promises', promises, '--format', 'json'])
    const result = resultSchema.parse(JSON.parse(out))
    expect(status).toBe(1)
    expect(
      result.promises.map(({ name, keys, verdict, broken, holds }) => [name, keys, verdict, broken, holds]),
    ).toEqual([
      ['gates', 'berth/*', 'broken', 1, 8],
      ['counts', 'sailing/*/boarded', 'broken', 3, 1],
    ])
    expect(result.findings.every(({ promise }) => promise === 'gates' || promise === 'counts')).toBe(true)
  })

  it('is an error where a glob matches no key, with the line', async () => {
    const wrong = file('wrong.yaml', 'promises:\n  - promise: regular\n    keys: "berths/*"\n')
    const { err, status } = await misread(['check', HARBOUR, '--promises', wrong])
    expect(status).toBe(2)
    expect(err).toMatch(/wrong\.yaml:2: no key matches "berths\/\*"/)
  })
})

describe('comparing runs', () => {
  const result = async (name: string, text: string): Promise<string> =>
    file(`${name}.json`, (await misread(['check', '-', '--format', 'json'], { input: text })).out)
  // The same findings at other times, on another key of the same pattern, from other clients.
  const later = BROKEN.replaceAll('"k"', '"berth/7"')
    .replaceAll('"C"', '"D"')
    .replace(/"(start|end)":(\d+)/g, (_, name, n) => `"${name}":${Number(n) + 1000}`)
  const earlier = BROKEN.replaceAll('"k"', '"berth/12"')

  it('a finding is known by what it is, not by lines, times and numbers in keys', async () => {
    const [old, now] = [await result('old', earlier), await result('now', later)]
    const { out, status } = await misread(['compare', old, now, '--format', 'json'])
    const comparison = comparisonSchema.parse(JSON.parse(out))
    expect(status).toBe(0)
    expect(comparison).toMatchObject({
      new: [],
      gone: [],
      still: [{ kind: 'stale-read', key: 'berth/#', old: 1, new: 1 }],
    })
  })

  it('another kind is new, and one that does not come again is gone', async () => {
    const lost = storyText('A w1 | A w2 | C r1 | D r1').replaceAll('"k"', '"berth/7"')
    const { out, status } = await misread([
      'compare',
      await result('old', earlier),
      await result('lost', lost),
    ])
    expect(status).toBe(1)
    expect(out).toMatch(/new:\n {2}- lost-write on berth\/# under linearizable: 1 finding/)
    expect(out).toMatch(/gone:\n {2}- stale-read/)
  })

  it('--baseline ends with 1 only for what is new', async () => {
    const old = await result('old', earlier)
    expect((await misread(['check', '-', '--baseline', old], { input: later })).status).toBe(0)
    expect(
      (await misread(['check', '-', '--baseline', old], { input: storyText('B r1 | A w1') })).status,
    ).toBe(1)
    expect((await misread(['check', '-', '--baseline', old], { input: SOUND })).status).toBe(0)
  })

  it('refuses what is no result, saying where', async () => {
    const { err, status } = await misread([
      'compare',
      file('none.json', '{"result":2}'),
      file('none.json', '{"result":2}'),
    ])
    expect(status).toBe(2)
    expect(err).toContain('none.json: found at result:')
  })
})

describe('survey', () => {
  it('says what is in the files', async () => {
    const { out, status } = await misread(['survey', HARBOUR, '--format', 'json'])
    const survey = surveySchema.parse(JSON.parse(out))
    expect(status).toBe(0)
    expect(survey.keys).toEqual({ register: 15, counter: 4, mixed: 0 })
    expect(survey.neverEnded).toBe(1)
    expect(survey.marks).toHaveLength(2)
  })

  it('counts what cannot be used, reads on and ends with 2', async () => {
    const { out, status } = await misread([
      'survey',
      file('half.ndjson', `${SOUND}nonsense\n${BROKEN.split('\n')[1].replace('"A"', '"B"')}\n`),
    ])
    expect(status).toBe(2)
    expect(out).toContain('1 record cannot be used')
  })
})

describe('help', () => {
  it.each([[['--help']], [['check', '--help']], [['survey', '--help']]])(
    '%j shows an example that works',
    async (args) => {
      const { out, status } = await misread(args)
      expect(status).toBe(0)
      const example = /Example:\n {2}misread (.*)\n/.exec(out)![1]
      const words = example.split(' ').map((word) => word.replaceAll('"', ''))
      const ran = await misread(
        words[0] === 'check' && words.includes('--out')
          ? [...words.slice(0, -1), join(folder, 'example')]
          : words,
      )
      expect([0, 1]).toContain(ran.status)
      expect(ran.err).toBe('')
    },
  )
})

describe('certificates', () => {
  it('of a check are accepted, and refused once anything differs', async () => {
    const path = join(folder, 'harbour.certificate.ndjson')
    expect((await misread(['check', HARBOUR, '--certificate', path])).status).toBe(1)
    const accepted = await misread(['verify', path, '--history', HARBOUR])
    expect([accepted.status, accepted.err]).toEqual([0, ''])
    expect(accepted.out).toMatch(
      /^accepted\nProved: \d+ claims that a promise holds, \d+ claims that one is broken\.\nIt is about linearizable; on every key; with clocks at most \d+ [nµm]?s off\.\n$/,
    )
    const other = await misread(['verify', path, '--history', file('other.ndjson', SOUND)])
    expect(other.status).toBe(1)
    expect(other.out).toContain('line 1: speaks of other input')
    expect((await misread(['check', HARBOUR, '--certificate', path])).err).toContain('stands already')
    expect((await misread(['check', '-', '--certificate', `${path}2`], { input: SOUND })).err).toContain(
      'give the history as one',
    )
  })

  it('of more than a chunk are read whole', async () => {
    const gates = Array.from({ length: 3000 }, (_, i) => `gate-${i}-${'x'.repeat(1000)}`)
    const history = gates.map((key, i) =>
      JSON.stringify({ client: 'a', op: 'write', key, value: i, start: 10 * i, end: 10 * i + 5 }),
    )
    const input = file('gates.ndjson', `${history.join('\n')}\n`)
    const path = join(folder, 'gates.certificate.ndjson')
    expect((await misread(['check', input, '--certificate', path])).status).toBe(0)
    const { status, out } = await misread(['verify', path, '--history', input])
    expect([status, out]).toEqual([0, expect.stringContaining('Proved: 3,000 claims that a promise holds')])
  })

  it('of an interrupted check are accepted, and prove what was decided by then', async () => {
    const path = join(folder, 'interrupted.certificate.ndjson')
    const args = ['check', HARBOUR, '--promise', 'linearizable', '--promise', 'causal', '--certificate', path]
    expect((await misread(args, { signal: AbortSignal.abort() })).status).toBe(130)
    const { status, out } = await misread(['verify', path, '--history', HARBOUR])
    expect([status, out]).toEqual([0, expect.stringMatching(/Undecided, so nothing to prove: \d\d+ claims/)])
  })

  it('say what they are about: what was not asked cannot be missing', async () => {
    const input = file('two.ndjson', SOUND)
    const path = join(folder, 'two.certificate.ndjson')
    const asked = ['--promise', 'durable', '--keys', '**', '--clock-error', '2ms']
    expect((await misread(['check', input, ...asked, '--certificate', path])).status).toBe(0)
    const { out } = await misread(['verify', path, '--history', input])
    expect(out).toContain('It is about durable; on keys ** alone; with clocks at most 2 ms off.')
    const json = JSON.parse((await misread(['verify', path, '--history', input, '--format', 'json'])).out)
    expect(json).toMatchObject({ accepted: true, about: { clockErrorNs: '2000000', onlyKeys: ['**'] } })
  })
})
