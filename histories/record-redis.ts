/**
 * Records a real Redis primary with a replica whose process is stopped and resumed now and then.
 *
 *   npx tsx histories/record-redis.ts --reads replica --operations 20000 --out redis-replica.ndjson
 *
 * --reads primary: everything through the primary. replica: three of four clients read from the replica, each by its
 * own connection to it. either: these clients' reads go to the one or the other by chance.
 *
 * Needs redis-server (Debian's package). Everything runs on loopback in a temporary folder and is ended and
 * removed at the end, also on errors and interrupts. Faults are injected into servers started here only.
 */
import { type ChildProcess, spawn } from 'node:child_process'
import { mkdtempSync, rmSync } from 'node:fs'
import { createServer } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { parseArgs } from 'node:util'
import { Redis } from 'ioredis'
import { Recorder, type RecordingClient } from '../src/recorder/index.js'

const { values: options } = parseArgs({
  options: {
    reads: { type: 'string', default: 'replica' },
    operations: { type: 'string', default: '20000' },
    clients: { type: 'string', default: '40' },
    keys: { type: 'string', default: '100' },
    pauses: { type: 'string', default: '30' },
    out: { type: 'string' },
  },
})
if (!options.out) throw new Error('--out FILE is missing: where to write the recording')
const reads = ['primary', 'replica', 'either'].find((mode) => mode === options.reads)
if (!reads) throw new Error('--reads takes primary, replica or either')

const operations = wholeNumber('operations', options.operations)
const clients = wholeNumber('clients', options.clients)
const keys = wholeNumber('keys', options.keys)
const pauses = wholeNumber('pauses', options.pauses)

const folder = mkdtempSync(join(tmpdir(), 'misread-redis-'))
const servers: ChildProcess[] = []
const connections: Redis[] = []

function cleanUp(): void {
  for (const connection of connections) connection.disconnect()
  for (const server of servers) {
    server.kill('SIGCONT')
    server.kill('SIGKILL')
  }
  rmSync(folder, { recursive: true, force: true })
}
process.once('exit', cleanUp)
for (const signal of ['SIGINT', 'SIGTERM'] as const) process.once(signal, () => process.exit(130))

function wholeNumber(name: string, text: string): number {
  if (!/^[0-9]{1,7}$/.test(text)) throw new Error(`--${name} takes a whole number, not ${text}`)
  return Number(text)
}

/** A port of loopback that is free now. */
function freePort(): Promise<number> {
  return new Promise((resolve, reject) => {
    const server = createServer()
    server.once('error', reject)
    server.listen(0, '127.0.0.1', () => {
      const { port } = server.address() as { port: number }
      server.close(() => resolve(port))
    })
  })
}

async function startServer(more: readonly string[]): Promise<{ port: number; server: ChildProcess }> {
  const port = await freePort()
  const server = spawn(
    'redis-server',
    [
      '--port',
      `${port}`,
      '--bind',
      '127.0.0.1',
      '--save',
      '',
      '--appendonly',
      'no',
      '--dir',
      folder,
      ...more,
    ],
    { stdio: 'ignore' },
  )
  server.once('error', (error) => {
    console.error(`redis-server cannot be started: ${error.message}`)
    process.exit(1)
  })
  servers.push(server)
  return { port, server }
}

function connect(port: number): Redis {
  const connection = new Redis({
    host: '127.0.0.1',
    port,
    retryStrategy: (tries) => (tries > 100 ? null : 50),
  })
  connection.on('error', () => {})
  connections.push(connection)
  return connection
}

const sleep = (ms: number): Promise<void> => new Promise((resolve) => setTimeout(resolve, ms))

/** Waits until the replica has everything that the primary has written. */
async function caughtUp(primary: Redis, replica: Redis): Promise<void> {
  for (let tries = 0; tries < 400; tries++) {
    const offset = (info: string, name: string): string | undefined =>
      new RegExp(`${name}:([0-9]+)`).exec(info)?.[1]
    const own = offset(await primary.info('replication'), 'master_repl_offset')
    const info = await replica.info('replication')
    if (info.includes('master_link_status:up') && own === offset(info, 'slave_repl_offset')) return
    await sleep(25)
  }
  throw new Error('the replica does not catch up')
}

async function main(out: string, mode: string): Promise<void> {
  const fromReplica = mode !== 'primary'
  const first = await startServer([])
  const primary = connect(first.port)
  await primary.ping()
  const second = await startServer(['--replicaof', '127.0.0.1', `${first.port}`])
  const replica = connect(second.port)
  await caughtUp(primary, replica)

  const recorder = new Recorder({
    path: out,
    title: `Redis primary and replica, reads from ${mode === 'either' ? 'either' : `the ${mode}`}`,
    host: 'recorder-1',
    // Redis answers a command with an error reply only when it did not carry it out.
    refusedWhen: (error) => error instanceof Error && error.name === 'ReplyError',
  })
  let left = operations
  let running = true
  const registers = Array.from({ length: Math.ceil(keys * 0.75) }, (_, i) => `berth/${i}`)
  const counters = Array.from({ length: Math.floor(keys * 0.25) }, (_, i) => `sailing/${i}/boarded`)

  /** INCRBY and GET answer strings; a count is recorded as the number that it is. */
  const asCount = (text: string | null): bigint | null => (text === null ? null : BigInt(text))
  const pick = <T>(items: readonly T[]): T => items[Math.floor(Math.random() * items.length)]

  async function drive(client: RecordingClient, writer: Redis, others: Redis | undefined): Promise<void> {
    const reader = (): Redis => (others && !(mode === 'either' && Math.random() < 0.5) ? others : writer)
    while (left-- > 0) {
      // Who reads from the replica takes its time, so that some requests begin while the replica stands still.
      if (others) await sleep(Math.random() * 12)
      const isCounter = counters.length > 0 && Math.random() < 0.25
      const key = pick(isCounter ? counters : registers)
      const isWrite = Math.random() < 0.45
      if (isWrite && isCounter) await client.increment(key, 1, async () => void (await writer.incrby(key, 1)))
      else if (isWrite) {
        const value = recorder.uniqueValue('vessel')
        await client.write(key, value, () => writer.set(key, value))
      }
      // Some read back at once what they have just written.
      if (isWrite && (Math.random() < 0.7 || left-- <= 0)) continue
      // Where reads go to either server, some look twice.
      for (let looks = mode === 'either' && Math.random() < 0.5 ? 2 : 1; looks > 0; looks--) {
        const from = reader()
        if (isCounter) await client.read(key, async () => asCount(await from.get(key)))
        else await client.read(key, () => from.get(key))
      }
    }
  }

  async function disturb(): Promise<void> {
    for (let i = 0; i < pauses && running; i++) {
      await sleep(40)
      if (!running) return
      const over = recorder.mark('replica stopped')
      second.server.kill('SIGSTOP')
      await sleep(70)
      second.server.kill('SIGCONT')
      over()
    }
  }

  const disturbance = fromReplica ? disturb() : Promise.resolve()
  await Promise.all(
    Array.from({ length: clients }, (_, i) => {
      const writer = connect(first.port)
      // Three of four clients read where the mode says, the others from the primary.
      const others = fromReplica && i % 4 !== 0 ? connect(second.port) : undefined
      return drive(recorder.client(`gate-${i + 1}`), writer, others)
    }),
  )
  running = false
  await disturbance

  await caughtUp(primary, replica)
  const closing = recorder.client('closing-reader')
  const last = fromReplica ? replica : primary
  for (const key of registers) await closing.read(key, () => last.get(key))
  for (const key of counters) await closing.read(key, async () => asCount(await last.get(key)))
  recorder.close()
}

try {
  await main(options.out, reads)
  process.exit(0)
} catch (error) {
  console.error(error)
  process.exit(1)
}
