import { mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { runInNewContext } from 'node:vm'
import { afterAll, describe, expect, it, vi } from 'vitest'
import { KIND_NAMES, OUTCOME_NAMES, UNSURE } from '../../src/history/columns.js'
import { readHistory } from '../../src/history/read.js'
import { fileSource } from '../../src/history/source.js'
import {
  type CasAnswer,
  type RecordableValue,
  Recorder,
  type RecorderOptions,
} from '../../src/recorder/index.js'

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

  it('refuses what it could not record exactly, before the request is sent', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    let sent = 0
    const send = async (): Promise<void> => void sent++
    const holes = [1]
    holes[2] = 3
    const cyclic: { self?: RecordableValue } = {}
    cyclic.self = cyclic as RecordableValue
    for (const [value, advice] of [
      [2 ** 53, 'bigint'],
      [-(2 ** 53), 'bigint'],
      [Number.NaN, 'NaN'],
      [Number.POSITIVE_INFINITY, 'Infinity'],
      [undefined, 'null for absence'],
      [new Date(0), 'instance of Date'],
      [new Map([['a', 1]]), 'instance of Map'],
      [Buffer.from('a'), 'instance of Buffer'],
      [() => 1, 'function'],
      [{ count: 2 ** 60 }, 'bigint'],
      [{ gone: undefined }, 'undefined'],
      [holes, 'undefined'],
      [cyclic, 'within itself'],
      ['x'.repeat(17 * 2 ** 20), '16 MiB'],
    ] as [RecordableValue, string][]) {
      await expect(gate.write('k', value, send), String(advice)).rejects.toThrow(advice)
    }
    await expect(gate.increment('n', 1.5, send as () => Promise<undefined>)).rejects.toThrow('whole number')
    await expect(gate.read('k', async () => null, { fields: { key: 'x' } })).rejects.toThrow('another name')
    await expect(gate.read(7 as unknown as string, async () => null)).rejects.toThrow('a string')
    expect(sent).toBe(0)
    // The client has no request in flight after a refusal.
    await gate.write('k', 'after all', send)
    recorder.close()
    expect((await historyOf(recorder.paths)).count).toBe(1)
  })

  it('records nothing nested deeper than readers take', async () => {
    const recorder = new Recorder({ path: path() })
    let deepest: RecordableValue = 1
    for (let i = 0; i < 500; i++) deepest = i % 2 === 0 ? [deepest] : { in: deepest }
    await recorder.client('gate-1').read('k', async () => deepest)
    await expect(recorder.client('gate-2').read('k', async () => [deepest])).rejects.toThrow('500 levels')
    recorder.close()
    expect((await historyOf(recorder.paths)).count).toBe(2)
  })

  it('takes an answer that it cannot record for unsure, and says what to do', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    const wrong = <T>(value: unknown) => (async () => value) as () => Promise<T>
    await expect(gate.increment('n', 1, async () => 2 ** 60)).rejects.toThrow('pass a bigint')
    await expect(gate.increment('n', 1, wrong<number>('7'))).rejects.toThrow('BigInt(text)')
    await expect(gate.increment('n', 1, wrong<number>(null))).rejects.toThrow('whole number')
    await expect(gate.cas('k', 'a', 'b', wrong<CasAnswer>('OK'))).rejects.toThrow('applied')
    await expect(gate.cas('k', 'a', 'b', wrong<CasAnswer>(undefined))).rejects.toThrow('applied')
    await expect(gate.read('k', wrong<null>(undefined))).rejects.toThrow('null for absence')
    recorder.close()
    const history = await historyOf(recorder.paths)
    expect(Array.from(history.outcome.subarray(0, history.count))).toEqual(Array(6).fill(UNSURE))
  })

  it('keeps values exact: 64-bit counts, fractions, lone surrogates, objects of another realm', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    const values = [
      -9223372036854775808n,
      10n ** 40n,
      0.1,
      '\ud800',
      'line\nend',
      { a: [true, null, { b: 1n }] },
      runInNewContext('({ a: 1 })') as RecordableValue,
    ]
    for (const value of values) await gate.write('k', value, async () => {})
    recorder.close()
    const history = await historyOf(recorder.paths)
    expect(Array.from(history.value.subarray(0, history.count), (id) => history.values.text(id))).toEqual([
      '-9223372036854775808',
      '1e40',
      '0.1',
      '"\\ud800"',
      '"line\\nend"',
      '{"a":[true,null,{"b":1}]}',
      '{"a":1}',
    ])
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

  it('in batches hands over within its time, or when so many bytes are there', async () => {
    const lines = (recorder: Recorder): number =>
      readFileSync(recorder.paths[0], 'utf8').split('\n').length - 2
    const slow = new Recorder({ path: path(), durable: 'batch', batchMs: 60_000, batchBytes: 1000 })
    slow.mark('short')
    expect(lines(slow)).toBe(0)
    slow.mark('x'.repeat(1000))
    expect(lines(slow)).toBe(2)
    slow.mark('short')
    slow.flush()
    expect(lines(slow)).toBe(3)
    slow.close()
    const quick = new Recorder({ path: path(), durable: 'batch', batchMs: 5 })
    quick.mark('short')
    await vi.waitFor(() => expect(lines(quick)).toBe(1))
    quick.close()
  })

  it('has an opening half in its file before the request is sent', async () => {
    const recorder = new Recorder({ path: path(), sync: true })
    let seen = ''
    await recorder.client('gate-1').write('k', 'vessel-1', async () => {
      seen = readFileSync(recorder.paths[0], 'utf8')
    })
    expect(seen.trim().split('\n').at(-1)).toMatch(/"value":"vessel-1","start":[0-9]{19}\}$/)
    recorder.close()
  })

  it('does not send a request once it is closed; what is in flight then stays unsure', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    let answer = (_: string): void => {}
    const slow = gate.read('k', () => new Promise<string>((resolve) => (answer = resolve)))
    recorder.close()
    answer('v')
    expect(await slow).toBe('v')
    let sent = 0
    await expect(gate.write('k', 1, async () => void sent++)).rejects.toThrow('closed')
    expect(sent).toBe(0)
    recorder.close()
    const history = await historyOf(recorder.paths)
    expect([history.count, OUTCOME_NAMES[history.outcome[0]]]).toEqual([1, 'unsure'])
  })

  it('goes on under the same client after a request that timed out', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    await expect(gate.write('k', 'a', () => Promise.reject(new Error('timed out')))).rejects.toThrow()
    await gate.write('k', 'b', async () => {})
    recorder.close()
    const text = readFileSync(recorder.paths[0], 'utf8')
    expect(text).toMatch(/"end":[0-9]{19},"outcome":"unsure","error":"Error: timed out"\}/)
    expect((await historyOf(recorder.paths)).count).toBe(2)
  })

  it('takes nothing for a refusal that its rule does not prove', async () => {
    const rules: unknown[] = [undefined, () => 'yes', async () => true, () => JSON.parse('?')]
    for (const rule of rules) {
      const recorder = new Recorder({
        path: path(),
        ...(rule ? { refusedWhen: rule as () => boolean } : {}),
      })
      const failing = recorder.client('gate').write('k', 1, () => Promise.reject(new Error('no')))
      await expect(failing).rejects.toThrow(/^no$/)
      recorder.close()
      const { outcome } = await historyOf(recorder.paths)
      expect(OUTCOME_NAMES[outcome[0]], String(rule)).toBe('unsure')
    }
  })

  it('keeps fields of the caller, which a report shows back', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    await gate.read('k', async () => null, { fields: { node: 'replica-2', trace: 18446744073709551615n } })
    recorder.close()
    expect(readFileSync(recorder.paths[0], 'utf8')).toContain(
      '"node":"replica-2","trace":18446744073709551615',
    )
    expect((await historyOf(recorder.paths)).count).toBe(1)
  })

  it('records what the store may delete by itself as unsure deletes of a client of its own', async () => {
    const recorder = new Recorder({ path: path() })
    const gate = recorder.client('gate-1')
    for (let i = 0; i < 3; i++) {
      recorder.mayVanish('lease')
      await gate.write('lease', recorder.uniqueValue(), async () => {})
    }
    expect(() => recorder.client('store-itself')).toThrow('exists already')
    expect(() => recorder.mayVanish(7 as unknown as string)).toThrow('a string')
    recorder.close()
    const history = await historyOf(recorder.paths)
    const seen = Array.from({ length: history.count }, (_, i) =>
      [KIND_NAMES[history.kind[i]], OUTCOME_NAMES[history.outcome[i]]].join(' '),
    )
    expect(seen.sort()).toEqual([...Array(3).fill('delete unsure'), ...Array(3).fill('write acked')])
    expect(history.clients.size).toBe(2)
    expect(history.hosts.size).toBe(1)
  })

  it('stamps all recorders of a process by one clock, near to wall time and never going back', async () => {
    const before = BigInt(Date.now() - 2) * 1_000_000n
    const recorders = [new Recorder({ path: path() }), new Recorder({ path: path() })]
    for (let i = 0; i < 100; i++) await recorders[i % 2].client(`gate-${i}`).write('k', i, async () => {})
    for (const recorder of recorders) recorder.close()
    const after = BigInt(Date.now() + 2) * 1_000_000n
    const history = await historyOf(recorders.flatMap(({ paths }) => paths))
    expect(history.hosts.size).toBe(1)
    expect(recorders[0].host).toBe(recorders[1].host)
    const stamps = recorders
      .flatMap(({ paths }) => readFileSync(paths[0], 'utf8').match(/"(start|end)":[0-9]+/g)!)
      .map((text) => BigInt(text.split(':')[1]))
      .sort((a, b) => (a < b ? -1 : 1))
    expect(stamps[0] >= before && stamps.at(-1)! <= after).toBe(true)
    expect(stamps).toHaveLength(200)
  })

  it('writes over nothing; restarted it takes the next file and new client names, read together with the old', async () => {
    const first = path()
    const runs = Array.from({ length: 3 }, () => new Recorder({ path: first, whenExists: 'next' }))
    for (const run of runs) {
      await run.client('gate-1').write('k', run.uniqueValue(), async () => {})
      run.close()
    }
    expect(() => new Recorder({ path: first })).toThrow("whenExists: 'next'")
    const paths = runs.flatMap((run) => run.paths)
    expect(paths).toEqual([
      first,
      first.replace('.ndjson', '-2.ndjson'),
      first.replace('.ndjson', '-3.ndjson'),
    ])
    const history = await historyOf(paths)
    expect([history.count, history.clients.size]).toEqual([3, 3])
  })

  it('steps over a file that stands where it would rotate to', async () => {
    const first = path()
    const taken = first.replace('.ndjson', '-2.ndjson')
    writeFileSync(taken, 'precious')
    const recorder = new Recorder({ path: first, rotateBytes: 1 })
    recorder.mark('one')
    recorder.close()
    expect(readFileSync(taken, 'utf8')).toBe('precious')
    expect(recorder.paths.at(-1)).toBe(first.replace('.ndjson', '-3.ndjson'))
    rmSync(taken)
  })

  it('refuses options that make no sense, and leaves no file', () => {
    const before = readdirSync(folder).length
    for (const [options, message] of [
      [{ path: '' }, 'name of a file'],
      [{ durable: 'bacth' }, 'line or batch'],
      [{ durable: 'batch', sync: true }, 'sync goes with'],
      [{ clockErrorNs: 2e6 }, 'bigint'],
      [{ clockErrorNs: -1n }, 'bigint'],
      [{ rotateBytes: 0 }, 'above 0'],
      [{ batchMs: Number.NaN }, 'above 0'],
      [{ whenExists: 'append' }, 'fail or next'],
      [{ initial: { k: 2 ** 53 } }, 'bigint'],
    ] as [object, string][]) {
      expect(() => new Recorder({ path: path(), ...options } as RecorderOptions), message).toThrow(message)
    }
    expect(readdirSync(folder)).toHaveLength(before)
  })

  it('puts title, clock error and initial values into the header of every file', async () => {
    const recorder = new Recorder({
      path: path(),
      title: 'drill "4"',
      clockErrorNs: 2_000_000n,
      initial: { n: 18446744073709551615n },
      initialUnknown: true,
      rotateBytes: 1,
    })
    await recorder.client('gate').read('n', async () => 18446744073709551615n)
    recorder.close()
    const header =
      '{"history":1,"title":"drill \\"4\\"","clockError":2000000,"initial":{"n":18446744073709551615},"initialUnknown":true}'
    for (const file of recorder.paths) expect(readFileSync(file, 'utf8').split('\n')[0]).toBe(header)
    const { clockErrorNs, initialUnknown } = await historyOf(recorder.paths)
    expect([clockErrorNs, initialUnknown]).toEqual([2_000_000n, true])
  })
})
