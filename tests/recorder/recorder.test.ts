import { spawn } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { OUTCOME_NAMES, UNSURE } from '../../src/history/columns.js'
import { readHistory } from '../../src/history/read.js'
import { fileSource } from '../../src/history/source.js'
import { Recorder } from '../../src/recorder/index.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-recorder-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))
let files = 0
const path = (): string => join(folder, `run${++files}.ndjson`)
const historyOf = async (paths: readonly string[]) =>
  readHistory(await Promise.all(paths.map((each) => fileSource(each))))

describe('a recorder', () => {
  it('records every kind of operation exactly', async () => {
    const recorder = new Recorder({ path: path(), title: 'drill' })
    const gate = recorder.client('gate-1')
    await gate.write('berth/1', 18446744073709551615n, async () => 'OK', { basis: null })
    await gate.read('berth/1', async () => 18446744073709551615n)
    await gate.increment('boarded', 2, async () => 7)
    await gate.cas('lease', 'a', 'b', async () => ({ applied: false, saw: { holder: 'c' } }))
    await gate.delete('lease', async () => {})
    recorder.mark('power cut')()
    recorder.close()
    const history = await historyOf(recorder.paths)
    const text = (id: number): string => history.values.text(id)
    expect(Array.from(history.value.subarray(0, 4), text)).toEqual([
      '18446744073709551615',
      '18446744073709551615',
      '7',
      '"b"',
    ])
    expect(text(history.extra[0])).toBe('null')
    expect(text(history.saw![3])).toBe('{"holder":"c"}')
    expect(history.hosts.size).toBe(1)
    expect(history.marks).toHaveLength(1)
  })

  it('takes errors for unsure, and for refused only what the rule says; and passes them on', async () => {
    const recorder = new Recorder({ path: path(), refusedWhen: (error) => (error as Error).message === 'no' })
    const gate = recorder.client('gate-1')
    const failing = (message: string) =>
      gate.write('k', recorder.uniqueValue(), () => Promise.reject(new Error(message)))
    await expect(failing('no')).rejects.toThrow('no')
    await expect(failing('time-out')).rejects.toThrow('time-out')
    recorder.close()
    const { outcome } = await historyOf(recorder.paths)
    expect([OUTCOME_NAMES[outcome[0]], OUTCOME_NAMES[outcome[1]]]).toEqual(['refused', 'unsure'])
  })

  it('lets a client have one request in flight, and a name once', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    expect(() => recorder.client('gate-1')).toThrow('its own name')
    const slow = gate.read('k', () => new Promise<null>((resolve) => setTimeout(() => resolve(null), 20)))
    await expect(gate.read('k', async () => null)).rejects.toThrow('in flight')
    await slow
    recorder.close()
    expect((await historyOf(recorder.paths)).count).toBe(1)
  })

  it('never gives two runs one client name or one value', () => {
    const one = new Recorder({ path: path() })
    const two = new Recorder({ path: path() })
    expect(one.client('gate').name).not.toBe(two.client('gate').name)
    const values = new Set(
      [one, two].flatMap((each) => Array.from({ length: 1000 }, () => each.uniqueValue())),
    )
    expect(values.size).toBe(2000)
    for (const each of [one, two]) each.close()
  })

  it('refuses values that it could not record exactly', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    expect(() => gate.write('k', 2 ** 53, async () => {})).toThrow('bigint')
    expect(() => gate.write('k', Number.NaN, async () => {})).toThrow('NaN')
    // An answer that cannot be recorded is unsure, and the request is not lost.
    await expect(gate.increment('n', 1, async () => 2 ** 60)).rejects.toThrow('bigint')
    recorder.close()
    const history = await historyOf(recorder.paths)
    expect([history.count, history.outcome[0]]).toEqual([1, UNSURE])
  })

  it('cuts its files by size; together they are one history', async () => {
    const recorder = new Recorder({ path: path(), rotateBytes: 2000 })
    const gate = recorder.client('gate-1')
    for (let i = 0; i < 50; i++) await gate.write('k', i, async () => {})
    recorder.close()
    expect(recorder.paths.length).toBeGreaterThan(3)
    expect((await historyOf(recorder.paths)).count).toBe(50)
  })

  it('in batches nothing is missing once it is closed', async () => {
    const recorder = new Recorder({ path: path(), durable: 'batch' })
    await Promise.all(
      Array.from({ length: 20 }, async (_, c) => {
        const client = recorder.client(`c${c}`)
        for (let i = 0; i < 50; i++) await client.write(`k${c}`, i, async () => {})
      }),
    )
    recorder.close()
    expect((await historyOf(recorder.paths)).count).toBe(1000)
  })
})

describe('a recorder that is killed', () => {
  it('leaves a history that reads, with every request that it had acknowledged to its caller', async () => {
    for (let round = 0; round < 12; round++) {
      const file = path()
      const child = spawn(process.execPath, ['--import', 'tsx', 'tests/recorder/busy-recorder.ts', file], {
        stdio: ['ignore', 'pipe', 'inherit'],
      })
      let acknowledged = 0
      await new Promise<void>((resolve) => {
        let isDoomed = false
        child.stdout.on('data', (chunk: Buffer) => {
          acknowledged = Number(String(chunk).trim().split('\n').at(-1))
          if (!isDoomed) setTimeout(() => child.kill('SIGKILL'), Math.random() * 40)
          isDoomed = true
        })
        child.once('exit', () => resolve())
      })
      const history = await historyOf([file])
      let acked = 0
      for (let i = 0; i < history.count; i++) if (OUTCOME_NAMES[history.outcome[i]] === 'acked') acked++
      expect(acked).toBeGreaterThanOrEqual(acknowledged)
      expect(acknowledged).toBeGreaterThan(0)
      expect(readFileSync(file, 'utf8').startsWith('{"history":1')).toBe(true)
    }
  })
})
