/** What a recorder leaves behind when its process ends at a moment that it did not choose. */
import { spawn } from 'node:child_process'
import { existsSync, mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { afterAll, describe, expect, it } from 'vitest'
import { OUTCOME_NAMES } from '../../src/history/columns.js'
import { InputError } from '../../src/history/problems.js'
import { readHistory } from '../../src/history/read.js'
import { fileSource } from '../../src/history/source.js'
import { compileBusyRecorder } from './compiled.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-killed-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))
const program = compileBusyRecorder(folder)
let runs = 0

interface Left {
  /** values that reached the store */
  readonly sent: string[]
  /** values whose recorded call returned to its caller */
  readonly done: string[]
  /** value → outcome in the recording */
  readonly recorded: Map<string, string>
  readonly files: string[]
  readonly said: string[]
  readonly code: number | null
}

type End =
  /** killed so long after its first request */
  | { readonly killAfterMs: number }
  /** killed so long after the process began, perhaps before there is a file */
  | { readonly killFromStartMs: number }
  | { readonly ending: 'exit' | 'throw' }
  /** the system refuses to let the file grow beyond so many KiB */
  | { readonly limitKiB: number }

async function run(options: object, end: End): Promise<Left> {
  const name = `run${++runs}`
  const args = [program, join(folder, `${name}.ndjson`), JSON.stringify(options)]
  if ('ending' in end) args.push(end.ending)
  const child =
    'limitKiB' in end
      ? spawn('bash', [
          '-c',
          `trap '' XFSZ; ulimit -f ${end.limitKiB}; exec "$@"`,
          'bash',
          process.execPath,
          ...args,
        ])
      : spawn(process.execPath, args)
  let output = ''
  const kill = (afterMs: number): void => void setTimeout(() => child.kill('SIGKILL'), afterMs)
  if ('killFromStartMs' in end) kill(end.killFromStartMs)
  child.stdout.once('data', () => {
    if ('killAfterMs' in end) kill(end.killAfterMs)
  })
  child.stdout.on('data', (chunk: Buffer) => {
    output += chunk
  })
  const code = await new Promise<number | null>((resolve) => child.once('close', resolve))
  // The last line may be cut short where the process died.
  const said = output.split('\n').slice(0, -1)
  const values = (word: string): string[] =>
    said.filter((line) => line.startsWith(`${word} `)).map((line) => line.slice(word.length + 1))
  const files = readdirSync(folder)
    .filter((each) => each.startsWith(`${name}.`) || each.startsWith(`${name}-`))
    .map((each) => join(folder, each))
  return { sent: values('sent'), done: values('done'), recorded: await recordedIn(files), files, said, code }
}

/** Reads what is there. The one thing that may be wrong with it is that no request was recorded yet. */
async function recordedIn(files: readonly string[]): Promise<Map<string, string>> {
  const recorded = new Map<string, string>()
  if (files.length === 0) return recorded
  try {
    const history = await readHistory(await Promise.all(files.map((file) => fileSource(file))))
    for (let i = 0; i < history.count; i++) {
      recorded.set(JSON.parse(history.values.text(history.value[i])), OUTCOME_NAMES[history.outcome[i]])
    }
  } catch (error) {
    if (!(error instanceof InputError)) throw error
    expect(error.problems.map(({ code }) => code)).toEqual(['empty-history'])
  }
  return recorded
}

/** `rounds` runs, a few at a time. */
async function inRounds(rounds: number, one: (round: number) => Promise<void>): Promise<void> {
  let next = 0
  const lane = async (): Promise<void> => {
    while (next < rounds) await one(next++)
  }
  await Promise.all([lane(), lane(), lane()])
}

function expectNothingLost({ sent, done, recorded }: Left): void {
  expect(sent.filter((value) => !recorded.has(value))).toEqual([])
  expect(done.filter((value) => recorded.get(value) !== 'acked')).toEqual([])
}

describe('a recorder that is killed', () => {
  it('line by line, has every request that reached the store, and every answer its caller got', async () => {
    let sent = 0
    await inRounds(30, async () => {
      const left = await run({}, { killAfterMs: Math.random() * 40 })
      expectNothingLost(left)
      sent += left.sent.length
    })
    expect(sent).toBeGreaterThan(100)
  })

  it('loses nothing while it changes from file to file', async () => {
    // A busy machine may kill one before its first change: over all rounds there are many.
    let changes = 0
    await inRounds(12, async () => {
      const left = await run({ rotateBytes: 3000 }, { killAfterMs: 5 + Math.random() * 40 })
      expectNothingLost(left)
      changes += left.files.length - 1
    })
    expect(changes).toBeGreaterThan(5)
  })

  it('leaves nothing or a file that reads, whenever it is killed after its process began', async () => {
    await inRounds(18, async (round) => {
      expectNothingLost(await run({}, { killFromStartMs: 15 + round * 4 }))
    })
  })

  it('in batches, leaves a history that reads and lacks no request that was with the system before', async () => {
    await inRounds(12, async () => {
      const left = await run({ durable: 'batch', batchMs: 5 }, { killAfterMs: 10 + Math.random() * 60 })
      const missing = left.sent.findIndex((value) => !left.recorded.has(value))
      // What is lost is the end: nothing is recorded that was sent after the first request that is missing.
      const after = missing < 0 ? [] : left.sent.slice(missing)
      expect(after.filter((value) => left.recorded.has(value))).toEqual([])
    })
  })
})

describe('a recorder in batches whose process', () => {
  it.each(['exit', 'throw'] as const)('ends by %s without closing it has lost nothing', async (ending) => {
    const left = await run({ durable: 'batch', batchMs: 60_000, batchBytes: 1e9 }, { ending })
    expect(left.sent.length).toBeGreaterThanOrEqual(500)
    expectNothingLost(left)
  })
})

describe.skipIf(process.platform === 'win32')('a recorder whose disk is full', () => {
  it('says so, sends no request that it cannot record, and leaves a history that reads', async () => {
    const left = await run({}, { limitKiB: 16 })
    expect(left.code).toBe(3)
    expect(left.said.at(-1)).toMatch(/^cannot cannot write the recording .*which ends here: .*EFBIG/)
    expect(left.sent.length).toBeGreaterThan(20)
    expectNothingLost(left)
    expect(existsSync(left.files[0]) && readFileSync(left.files[0], 'utf8').endsWith('\n')).toBe(false)
  })
})
