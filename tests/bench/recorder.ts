/**
 * What recording costs: a request that answers at once, with and without the recorder, in nanoseconds and bytes an
 * operation. Five rounds each; the median is told.
 *
 *   npx tsx tests/bench/recorder.ts [OPERATIONS]
 */
import { mkdtempSync, rmSync, statSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { Recorder, type RecorderOptions } from '../../src/recorder/index.js'

const operations = Number(process.argv[2] ?? 50_000)
const folder = mkdtempSync(join(tmpdir(), 'misread-bench-'))
let files = 0

async function nsEach(count: number, one: (i: number) => Promise<unknown>): Promise<number> {
  const begun = process.hrtime.bigint()
  for (let i = 0; i < count; i++) await one(i)
  return Number(process.hrtime.bigint() - begun) / count
}

async function recorded(
  count: number,
  options: Partial<RecorderOptions>,
): Promise<[ns: number, bytes: number]> {
  const recorder = new Recorder({ path: join(folder, `${++files}.ndjson`), ...options })
  const client = recorder.client('gate-1')
  const ns = await nsEach(count, (i) => client.write('berth/2', i, async () => {}))
  recorder.close()
  return [ns, statSync(recorder.paths[0]).size / count]
}

const median = (numbers: number[]): number => numbers.sort((a, b) => a - b)[Math.floor(numbers.length / 2)]

try {
  const rounds = [1, 2, 3, 4, 5]
  const bare: number[] = []
  for (const _ of rounds) bare.push(await nsEach(operations, async () => {}))
  console.log(`a request that answers at once, without a recorder: ${median(bare).toFixed(0)} ns`)
  for (const [name, count, options] of [
    ['batch', operations, { durable: 'batch' }],
    ['line', operations, {}],
    ['line with sync', Math.ceil(operations / 100), { sync: true }],
  ] as [string, number, Partial<RecorderOptions>][]) {
    const times: number[] = []
    let bytes = 0
    for (const _ of rounds) {
      const [ns, each] = await recorded(count, options)
      times.push(ns)
      bytes = each
    }
    const more = median(times) - median(bare)
    console.log(`${name}: ${(more / 1000).toFixed(1)} us and ${bytes.toFixed(0)} bytes more an operation`)
  }
} finally {
  rmSync(folder, { recursive: true, force: true })
}
