/**
 * Records a real Redis primary with a replica whose process is stopped and resumed now and then.
 *
 *   npx tsx histories/record-redis.ts --reads replica --operations 20000 --out redis-replica.ndjson
 *
 * --reads primary: everything through the primary. replica: every second client reads from the replica, by its own
 * connection to it. either: these clients' reads go to the one or the other by chance.
 * --operations, --clients, --keys: so many, counters being a quarter of the keys; closing reads come on top.
 * --seconds: ends after so long, whatever is left. --think: milliseconds that a client waits at most between requests,
 * eight times as many where it may read from the replica. --seed: repeats what each client asks for, though not when.
 *
 * Needs redis-server (Debian's package).
 */
import { parseArgs } from 'node:util'
import type { Redis } from 'ioredis'
import { Recorder, type RecordingClient } from '../src/recorder/index.js'
import { caughtUp, Servers, sleep } from './redis-servers.js'

const { values: options } = parseArgs({
  options: {
    reads: { type: 'string', default: 'replica' },
    operations: { type: 'string', default: '20000' },
    seconds: { type: 'string', default: '600' },
    clients: { type: 'string', default: '24' },
    keys: { type: 'string', default: '80' },
    think: { type: 'string', default: '5' },
    seed: { type: 'string', default: '1' },
    out: { type: 'string' },
  },
})
if (!options.out) throw new Error('--out FILE is missing: where to write the recording')
if (!['primary', 'replica', 'either'].includes(options.reads))
  throw new Error('--reads takes primary, replica or either')

const operations = wholeNumber('operations', options.operations)
const clients = wholeNumber('clients', options.clients)
const keys = wholeNumber('keys', options.keys)
const thinkMs = wholeNumber('think', options.think)
const seed = wholeNumber('seed', options.seed)
const endsAtMs = performance.now() + wholeNumber('seconds', options.seconds) * 1000

function wholeNumber(name: string, text: string): number {
  if (!/^[0-9]{1,9}$/.test(text)) throw new Error(`--${name} takes a whole number, not ${text}`)
  return Number(text)
}

/** Random numbers from 0 up to 1 that a seed repeats (Marsaglia 2003, xorshift with 32 bits). */
function randomFrom(start: number): () => number {
  let state = Math.imul(start + 1, 0x9e3779b1) | 1
  const next = (): number => {
    state ^= state << 13
    state ^= state >>> 17
    state ^= state << 5
    return (state >>> 0) / 2 ** 32
  }
  for (let i = 0; i < 8; i++) next()
  return next
}

/** One of the servers, by a client's own connection. */
interface Node {
  readonly name: 'primary' | 'replica'
  readonly connection: Redis
}

const registers = Array.from({ length: keys - Math.floor(keys / 4) }, (_, i) => `berth/${i}`)
const counters = Array.from({ length: Math.floor(keys / 4) }, (_, i) => `sailing/${i}/boarded`)

/** GET answers a string; a count is recorded as the number that it is. */
function read(client: RecordingClient, key: string, { name, connection }: Node): Promise<unknown> {
  const fields = { node: name }
  if (key.startsWith('berth/')) return client.read(key, () => connection.get(key), { fields })
  const asCount = (text: string | null): bigint | null => (text === null ? null : BigInt(text))
  return client.read(key, async () => asCount(await connection.get(key)), { fields })
}

async function main(out: string, mode: string): Promise<void> {
  const servers = new Servers()
  const first = await servers.start()
  const second = await servers.start(first)
  const primary: Node = { name: 'primary', connection: servers.connect(first.port) }
  const replica: Node = { name: 'replica', connection: servers.connect(second.port) }
  await caughtUp(primary.connection, replica.connection)

  const recorder = new Recorder({
    path: out,
    title: `Redis primary and replica, reads from ${mode === 'either' ? 'either' : `the ${mode}`}`,
    host: 'recorder-1',
    // Redis answers these commands with an error reply only when it did not carry them out.
    refusedWhen: (error) => error instanceof Error && error.name === 'ReplyError',
  })
  let left = operations
  let running = true
  let failed = 0

  /** A request that fails is in the recording, and its client goes on; where many fail, something else is wrong. */
  async function attempt(request: Promise<unknown>): Promise<void> {
    try {
      await request
    } catch (error) {
      if (++failed > operations / 20) throw new Error('too many requests fail', { cause: error })
    }
  }

  async function drive(i: number): Promise<void> {
    const client = recorder.client(`gate-${i + 1}`)
    const random = randomFrom(seed * 1000 + i)
    const own: Node = { name: 'primary', connection: servers.connect(first.port) }
    // Every second client reads where the mode says, the others from the primary.
    const isAway = mode !== 'primary' && i % 2 === 1
    const away: Node = isAway ? { name: 'replica', connection: servers.connect(second.port) } : own
    while (left > 0 && performance.now() < endsAtMs) {
      // Who may read from the replica takes its time, so that some of these reads begin late in a stop.
      await sleep(random() * thinkMs * (isAway ? 8 : 1))
      const kind = counters.length > 0 && random() < 0.25 ? counters : registers
      const key = kind[Math.floor(random() * kind.length)]
      const isWrite = random() < 0.45
      if (isWrite && kind === counters) {
        // The count that INCRBY answers is not recorded: an application that counts seldom looks at it.
        await attempt(client.increment(key, 1, async () => void (await own.connection.incrby(key, 1))))
        left--
      } else if (isWrite) {
        const value = recorder.uniqueValue('vessel')
        await attempt(client.write(key, value, () => own.connection.set(key, value)))
        left--
      }
      // Some read back at once what they have just written. Where reads go to either server, some look twice.
      let looks = isWrite && random() < 0.7 ? 0 : mode === 'either' && random() < 0.5 ? 2 : 1
      for (; looks > 0 && left > 0; looks--, left--) {
        await attempt(read(client, key, mode === 'either' && random() < 0.5 ? own : away))
      }
    }
  }

  /**
   * Other traffic, on a key outside the recording: a stopped replica then falls behind by more than it takes in at
   * once when it goes on, and answers from the past meanwhile.
   */
  async function load(): Promise<void> {
    const connection = servers.connect(first.port)
    const cargo = 'x'.repeat(16 * 1024)
    while (running) {
      await connection.set('cargo', cargo)
      await sleep(1)
    }
  }

  async function disturb(): Promise<void> {
    const random = randomFrom(seed)
    while (running) {
      await sleep(60 + random() * 120)
      if (!running) return
      const over = recorder.mark('replica stopped')
      second.stop()
      await sleep(40 + random() * 100)
      second.resume()
      over()
    }
  }

  const disturbance = Promise.all([load(), disturb()])
  await Promise.all(Array.from({ length: clients }, (_, i) => drive(i)))
  running = false
  await disturbance

  // Settled: every key once more from each server that was read.
  await caughtUp(primary.connection, replica.connection)
  for (const node of mode === 'primary' ? [primary] : [replica, primary]) {
    const closing = recorder.client(`closing-${node.name}`)
    for (const key of [...registers, ...counters]) await attempt(read(closing, key, node))
  }
  recorder.close()
}

try {
  await main(options.out, options.reads)
  process.exit(0)
} catch (error) {
  console.error(error)
  process.exit(1)
}
