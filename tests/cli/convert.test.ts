import { mkdir, mkdtemp, readdir, readFile, rm, symlink, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { gunzipSync, gzipSync } from 'node:zlib'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { misread } from './in-process.js'

const MAPPING = 'docs/convert/requests.yaml'
const LOG = 'docs/convert/requests.csv'
let folder: string

beforeAll(async () => {
  folder = await mkdtemp(join(tmpdir(), 'misread-convert-'))
})
afterAll(async () => {
  await rm(folder, { recursive: true })
})

describe('misread convert', () => {
  it('writes a history to standard output and what it did to standard error', async () => {
    const { status, out, err } = await misread(['convert', LOG, '--mapping', MAPPING])
    expect(status).toBe(0)
    expect(out.split('\n')).toHaveLength(10)
    expect(err).toBe(
      '8 operations (2 read, 3 write, 2 cas, 1 delete; 6 acked, 1 refused, 1 unsure)\n' +
        '1 record passed over by a rule of the mapping (skip)\n' +
        '1 operation that no outcome rule fits: taken as unsure\n',
    )
    expect((await misread(['survey', '-'], { input: out })).out).toContain('8 operations')
  })

  it('writes a file, packed by its name, and takes packed files and standard input', async () => {
    const plain = join(folder, 'plain.ndjson')
    const packed = join(folder, 'packed.ndjson.gz')
    const log = await readFile(LOG)
    await writeFile(join(folder, 'log.csv.gz'), gzipSync(log))
    expect(
      (await misread(['convert', join(folder, 'log.csv.gz'), '--mapping', MAPPING, '--out', packed])).status,
    ).toBe(0)
    const { status, out } = await misread(['convert', '-', '--mapping', MAPPING, '--out', plain], {
      input: log.toString(),
    })
    expect([status, out]).toEqual([0, ''])
    const text = await readFile(plain, 'utf8')
    expect(gunzipSync(await readFile(packed)).toString()).toBe(text)
    expect((await misread(['check', packed])).status).toBe(0)
  })

  it('joins several files into one history', async () => {
    const second = join(folder, 'second.csv')
    await writeFile(second, (await readFile(LOG, 'utf8')).replaceAll('2024-07-01T20', '2024-07-01T21'))
    const { out } = await misread(['convert', LOG, second, '--mapping', MAPPING])
    expect(out.match(/"history":1/g)).toHaveLength(1)
    expect(out.trimEnd().split('\n')).toHaveLength(17)
  })

  it('leaves nothing behind when something is wrong', async () => {
    const bad = join(folder, 'bad.csv')
    const out = join(folder, 'never.ndjson')
    await writeFile(bad, `${await readFile(LOG, 'utf8')}gate-1,POP,2,x,,2024-07-01T20:00:01Z,1,200,0\n`)
    const { status, err } = await misread(['convert', bad, '--mapping', MAPPING, '--out', out])
    expect(status).toBe(2)
    expect(err).toContain('bad.csv:11: found the op "POP", expected read, write, increment, cas, delete')
    expect(err).toMatch(/\nnothing was written\n$/)
    expect((await readdir(folder)).filter((name) => name.startsWith('never'))).toEqual([])
  })

  it('says when what went to standard output is not whole', async () => {
    const bad = join(folder, 'long.csv')
    const [head, row] = (await readFile(LOG, 'utf8')).split('\n')
    await writeFile(bad, `${head}\n${`${row}\n`.repeat(20_000)}broken\n`)
    const { status, out, err } = await misread(['convert', bad, '--mapping', MAPPING])
    expect(status).toBe(2)
    expect(out.length).toBeGreaterThan(0)
    expect(err).toMatch(/what was written to standard output is not whole\n$/)
  })

  it('writes over nothing without --force, and never over an input or what is no file', async () => {
    const out = join(folder, 'mine.ndjson')
    await writeFile(out, 'mine')
    const refused = await misread(['convert', LOG, '--mapping', MAPPING, '--out', out])
    expect(refused).toMatchObject({
      status: 2,
      err: expect.stringContaining('stands already; name another file, or add --force'),
    })
    expect(await readFile(out, 'utf8')).toBe('mine')
    expect((await misread(['convert', LOG, '--mapping', MAPPING, '--out', out, '--force'])).status).toBe(0)
    expect(await readFile(out, 'utf8')).toContain('"history":1')

    const log = join(folder, 'own.csv')
    await writeFile(log, await readFile(LOG))
    const own = await misread(['convert', log, '--mapping', MAPPING, '--out', log, '--force'])
    expect(own).toMatchObject({ status: 2, err: expect.stringContaining('is an input as well') })
    await mkdir(join(folder, 'dir'))
    await symlink(out, join(folder, 'link'))
    for (const name of ['dir', 'link']) {
      const { status, err } = await misread([
        'convert',
        LOG,
        '--mapping',
        MAPPING,
        '--out',
        join(folder, name),
        '--force',
      ])
      expect([status, err]).toEqual([2, expect.stringContaining('is no regular file')])
    }
    const missing = await misread([
      'convert',
      LOG,
      '--mapping',
      MAPPING,
      '--out',
      join(folder, 'no', 'where.ndjson'),
    ])
    expect(missing).toMatchObject({ status: 2, err: expect.stringContaining('cannot write') })
  })

  it('needs a mapping, and says where one is wrong', async () => {
    expect(await misread(['convert', LOG])).toMatchObject({
      status: 2,
      err: expect.stringContaining('--mapping'),
    })
    const none = await misread(['convert', LOG, '--mapping', join(folder, 'none.yaml')])
    expect(none).toMatchObject({ status: 2, err: expect.stringContaining('found no such file') })
    const wrong = join(folder, 'wrong.yaml')
    await writeFile(wrong, (await readFile(MAPPING, 'utf8')).replace('client:', 'clients:'))
    const { status, err } = await misread(['convert', LOG, '--mapping', wrong])
    expect(status).toBe(2)
    expect(err).toMatch(/wrong\.yaml:6:1: found "clients", .*did you mean client\?\nnothing was written\n/)
  })

  it('stops when interrupted and leaves nothing behind', async () => {
    const controller = new AbortController()
    controller.abort()
    const out = join(folder, 'interrupted.ndjson')
    const ran = await misread(['convert', LOG, '--mapping', MAPPING, '--out', out], {
      signal: controller.signal,
    })
    expect(ran).toMatchObject({ status: 130, err: 'interrupted; nothing was written\n' })
    expect((await readdir(folder)).filter((name) => name.startsWith('interrupted'))).toEqual([])
  })
})
