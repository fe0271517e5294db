/**
 * Redis servers of our own: on free ports of loopback, without persistence, in a temporary folder, ended and removed
 * however this process ends (but for a kill that leaves it no time). Faults go to these and to no others.
 */
import { type ChildProcess, spawn } from 'node:child_process'
import { mkdtempSync, rmSync } from 'node:fs'
import { createServer } from 'node:net'
import { tmpdir } from 'node:os'
import { join } from 'node:path'
import { Redis } from 'ioredis'

export interface Server {
  readonly port: number
  /** Stops its process as it is (SIGSTOP): it answers nothing and reads nothing, its connections stay. */
  stop(): void
  resume(): void
}

export class Servers {
  readonly #folder = mkdtempSync(join(tmpdir(), 'misread-redis-'))
  readonly #processes: ChildProcess[] = []
  readonly #connections: Redis[] = []
  #ended = false

  constructor() {
    process.once('exit', () => this.end())
    // The numbers are what shells report for these signals.
    for (const [signal, status] of [
      ['SIGHUP', 129],
      ['SIGINT', 130],
      ['SIGTERM', 143],
    ] as const) {
      process.once(signal, () => process.exit(status))
    }
  }

  /** Starts a server, a replica of `primary` where one is given. Rejects when it does not come up. */
  async start(primary?: Server): Promise<Server> {
    const port = await freePort()
    const settings = {
      port,
      bind: '127.0.0.1',
      save: '',
      appendonly: 'no',
      dir: this.#folder,
      // Else a primary waits five seconds for further replicas.
      'repl-diskless-sync-delay': 0,
    }
    const args = Object.entries(settings).flatMap(([name, value]) => [`--${name}`, `${value}`])
    if (primary) args.push('--replicaof', '127.0.0.1', `${primary.port}`)
    const server = spawn('redis-server', args, { stdio: 'ignore' })
    this.#processes.push(server)
    const ended = new Promise<never>((_, reject) => {
      server.once('error', (error) => reject(new Error(`redis-server cannot be started: ${error.message}`)))
      server.once('exit', (code, signal) => {
        reject(new Error(`the redis-server at port ${port} ended by itself (${signal ?? `status ${code}`})`))
      })
    })
    ended.catch((error) => {
      if (this.#ended) return
      console.error(error.message)
      process.exit(1)
    })
    const connection = this.connect(port, { untilUp: true })
    const info = await Promise.race([connection.info('server'), ended])
    // Somebody else's server may have taken the port in between; nothing may be done to that.
    if (!info.includes(`process_id:${server.pid}\r`))
      throw new Error(`port ${port} was taken by another server`)
    return { port, stop: () => void server.kill('SIGSTOP'), resume: () => void server.kill('SIGCONT') }
  }

  /**
   * A connection. It never sends a request a second time by itself: an increment repeated behind the recorder's back
   * would look like the store's doing. A request without an answer is an error after 10 seconds.
   */
  connect(port: number, { untilUp = false } = {}): Redis {
    const connection = new Redis({
      host: '127.0.0.1',
      port,
      autoResendUnfulfilledCommands: false,
      maxRetriesPerRequest: untilUp ? null : 0,
      commandTimeout: 10_000,
      retryStrategy: (tries) => (tries > 200 ? null : 50),
    })
    connection.on('error', () => {})
    this.#connections.push(connection)
    return connection
  }

  end(): void {
    if (this.#ended) return
    this.#ended = true
    for (const connection of this.#connections) connection.disconnect()
    // SIGKILL ends stopped processes, too.
    for (const server of this.#processes) server.kill('SIGKILL')
    rmSync(this.#folder, { recursive: true, force: true, maxRetries: 5 })
  }
}

export const sleep = (ms: number): Promise<void> => new Promise((resolve) => setTimeout(resolve, ms))

/** Waits until the replica has everything that the primary has written. */
export async function caughtUp(primary: Redis, replica: Redis): Promise<void> {
  const field = (info: string, name: string): string | undefined =>
    new RegExp(`${name}:([0-9]+)`).exec(info)?.[1]
  for (let tries = 0; tries < 400; tries++) {
    const own = field(await primary.info('replication'), 'master_repl_offset')
    const info = await replica.info('replication')
    if (info.includes('master_link_status:up') && own === field(info, 'slave_repl_offset')) return
    await sleep(25)
  }
  throw new Error('the replica does not catch up')
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
