import { mkdtemp, readdir, readFile, rm, writeFile } from 'node:fs/promises'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, beforeAll, describe, expect, it } from 'vitest'
import { SCENARIOS } from '../../src/rehearsal/scenarios.js'
import { misread } from '../cli/in-process.js'
import { named, play } from './play.js'

let folder: string
beforeAll(async () => {
  folder = await mkdtemp(join(tmpdir(), 'misread-rehearse-'))
})
afterAll(() => rm(folder, { recursive: true }))

describe('misread rehearse', () => {
  it('writes the history, the truth and the scenario, and says what to do next', async () => {
    const out = join(folder, 'one')
    const ran = await misread(['rehearse', '--scenario', 'failover', '--seed', '7', '--out', out])
    expect([ran.status, ran.err]).toEqual([0, ''])
    expect((await readdir(out)).sort()).toEqual(['history.ndjson', 'scenario.yaml', 'truth.ndjson'])
    const { history, truth, account } = play(named('failover'), 7)
    expect(await readFile(join(out, 'history.ndjson'), 'utf8')).toBe(history)
    expect(await readFile(join(out, 'truth.ndjson'), 'utf8')).toBe(truth)
    expect(ran.out).toContain(`${account.operations.toLocaleString('en-US')} operations: `)
    for (const { effect, cause, count } of account.hits)
      expect(ran.out).toMatch(new RegExp(`^ +${count} +${effect} +${cause}$`, 'm'))
    const next = /^Next: misread (.+)$/m.exec(ran.out)![1]
    expect((await misread(next.split(' '))).status).toBe(1)
  })

  it('packs the history when asked, and quotes a path that needs it', async () => {
    const out = join(folder, "the harbour's")
    const ran = await misread(['rehearse', '--scenario', 'sound', '--lasts', '300ms', '--gzip', '--out', out])
    expect(ran.status).toBe(0)
    expect((await readdir(out)).sort()).toEqual(['history.ndjson.gz', 'scenario.yaml', 'truth.ndjson'])
    expect(ran.out).toContain(`Next: misread check '${join(folder, "the harbour'\\''s")}/history.ndjson.gz'`)
    expect((await misread(['check', join(out, 'history.ndjson.gz')])).status).toBe(0)
  })

  it('plays what it wrote and what it prints, to the same end', async () => {
    const one = join(folder, 'again-1')
    const two = join(folder, 'again-2')
    const three = join(folder, 'again-3')
    const printed = await misread(['rehearse', '--scenario', 'handover', '--print'])
    expect([printed.status, printed.err]).toEqual([0, ''])
    const own = join(folder, 'own.yaml')
    await writeFile(own, printed.out)
    await misread(['rehearse', '--scenario', 'handover', '--seed', '3', '--out', one])
    await misread(['rehearse', '--scenario', join(one, 'scenario.yaml'), '--seed', '3', '--out', two])
    await misread(['rehearse', '--scenario', own, '--seed', '3', '--out', three])
    for (const file of ['history.ndjson', 'truth.ndjson']) {
      const text = await readFile(join(one, file), 'utf8')
      expect(await readFile(join(two, file), 'utf8')).toBe(text)
      expect(await readFile(join(three, file), 'utf8')).toBe(text)
    }
  })

  it('lists every scenario in a line', async () => {
    const { status, out } = await misread(['rehearse', '--list'])
    expect(status).toBe(0)
    expect(
      out
        .trimEnd()
        .split('\n')
        .map((line) => line.split(' ')[0]),
    ).toEqual(SCENARIOS.map(({ name }) => name))
  })

  it('goes on for longer or less when asked, where the faults still fit', async () => {
    const ran = await misread([
      'rehearse',
      '--scenario',
      'sound',
      '--lasts',
      '200ms',
      '--out',
      join(folder, 'short'),
    ])
    expect(ran.status).toBe(0)
    expect(Number(/^([0-9,]+) operations/m.exec(ran.out)![1])).toBeLessThan(400)
    const out = join(folder, 'shorter')
    expect(
      await misread(['rehearse', '--scenario', 'failover', '--lasts', '200ms', '--out', out]),
    ).toMatchObject({
      status: 2,
      err: expect.stringContaining('--lasts: found a fault after the end'),
    })
    expect((await readdir(folder)).includes('shorter')).toBe(false)
  })

  it.each([
    [['rehearse'], 'which scenario? Name one or a file with --scenario'],
    [['rehearse', '--scenario', 'failver', '--out', 'x'], 'did you mean failover?'],
    [['rehearse', '--scenario', 'failover'], 'where to? Name a folder with --out'],
    [['rehearse', '--scenario', './none.yaml', '--out', 'x'], 'none.yaml: found no such file'],
    [['rehearse', '--scenario', 'failover', '--seed', '-1'], 'Expected a whole number'],
    [['rehearse', '--scenario', 'failover', '--lasts', 'long'], 'Expected a duration'],
  ])('%j is refused', async (args, message) => {
    expect(await misread(args)).toMatchObject({ status: 2, err: expect.stringContaining(message) })
  })

  it('says where a scenario file is wrong, and writes nothing', async () => {
    const wrong = join(folder, 'wrong.yaml')
    await writeFile(wrong, 'rehearsal: 1\nstore: {nods: 3}\n')
    const out = join(folder, 'wrong')
    const { status, err } = await misread(['rehearse', '--scenario', wrong, '--out', out])
    expect(status).toBe(2)
    expect(err).toMatch(
      /wrong\.yaml:2:9: found "nods", expected .*did you mean nodes\?\nnothing was written\n$/,
    )
    expect(await readdir(folder)).not.toContain('wrong')
  })

  it('writes over nothing without --force, and not over its own scenario', async () => {
    const out = join(folder, 'kept')
    const play = (...more: string[]): ReturnType<typeof misread> =>
      misread(['rehearse', '--scenario', 'sound', '--lasts', '100ms', '--out', out, ...more])
    expect((await play()).status).toBe(0)
    const before = await readFile(join(out, 'history.ndjson'), 'utf8')
    expect(await play('--seed', '2')).toMatchObject({
      status: 2,
      err: expect.stringContaining('stands already'),
    })
    expect(await readFile(join(out, 'history.ndjson'), 'utf8')).toBe(before)
    expect((await play('--seed', '2', '--force')).status).toBe(0)
    expect(await readFile(join(out, 'history.ndjson'), 'utf8')).not.toBe(before)
    expect((await readdir(out)).sort()).toEqual(['history.ndjson', 'scenario.yaml', 'truth.ndjson'])
    const own = ['rehearse', '--scenario', join(out, 'scenario.yaml'), '--out', out, '--force']
    expect(await misread(own)).toMatchObject({
      status: 2,
      err: expect.stringContaining('is an input as well'),
    })
    expect((await readdir(out)).sort()).toEqual(['history.ndjson', 'scenario.yaml', 'truth.ndjson'])
  })

  it('stops when interrupted and leaves nothing behind', async () => {
    const controller = new AbortController()
    const out = join(folder, 'interrupted')
    setTimeout(() => controller.abort(), 50)
    const ran = await misread(['rehearse', '--scenario', 'sound', '--lasts', '24h', '--out', out], {
      signal: controller.signal,
    })
    expect(ran).toMatchObject({ status: 130, out: '', err: 'interrupted; nothing was written\n' })
    expect(await readdir(out)).toEqual([])
  })
})
