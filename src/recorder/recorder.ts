/**
 * Records what the clients of an application or driver ask of a store, as a history that `misread check` reads.
 */
import { randomBytes } from 'node:crypto'
import { RecordingClient } from './client.js'
import { CLOCK_NAME, nowNs } from './clock.js'
import { RecordFile } from './record-file.js'
import { type RecordableValue, shown, valueText } from './values.js'

/** Whose deletes expiry and eviction are. */
const STORE_CLIENT = 'store-itself'

export interface RecorderOptions {
  /** where to write, `run.ndjson` */
  readonly path: string
  /** `path` exists already: an error (default), or `next`: run-2.ndjson, for a program that may be restarted */
  readonly whenExists?: 'fail' | 'next'
  readonly title?: string
  /** how far this process's clock may be from true time, in nanoseconds; matters once several hosts record */
  readonly clockErrorNs?: bigint
  /** values of keys before the recording */
  readonly initial?: Readonly<Record<string, RecordableValue>>
  /** the store was not empty, and what it held is not known */
  readonly initialUnknown?: boolean
  /**
   * name of this process's clock, which all its clients share. Default: machine, process and a random part. Give
   * one only where no other process gives the same
   */
  readonly host?: string
  /**
   * `line` (default): the opening half of an operation is with the operating system before its request is sent,
   * so that killing this process loses no request. `batch`: lines are held for up to `batchMs` or `batchBytes`;
   * a kill loses those.
   */
  readonly durable?: 'line' | 'batch'
  /** with `line`: wait for the disk too, so that a power cut loses no request. Slow. Default false */
  readonly sync?: boolean
  /** default 20 milliseconds */
  readonly batchMs?: number
  /** default 64 KiB */
  readonly batchBytes?: number
  /** begin a new file after so many bytes; default never */
  readonly rotateBytes?: number
  /**
   * True for errors that prove that nothing happened (a refusal). All others are unsure, and so is every error
   * by default, or when the rule itself throws.
   */
  readonly refusedWhen?: (error: unknown) => boolean
}

export class Recorder {
  /** names this run; part of every client's name and of unique values, so that no two runs share one */
  readonly run = `${Date.now().toString(36)}${randomBytes(3).toString('hex')}`
  /** name of the clock that stamps all records */
  readonly host: string
  readonly #file: RecordFile
  readonly #refusedWhen: (error: unknown) => boolean
  readonly #clients = new Set([STORE_CLIENT])
  #values = 0
  #ids = 0

  /** Begins the file. Throws when it cannot be made, or on an option that makes no sense. */
  constructor(options: RecorderOptions) {
    checkOptions(options)
    this.host = options.host ?? CLOCK_NAME
    this.#refusedWhen = options.refusedWhen ?? (() => false)
    this.#file = new RecordFile({
      path: options.path,
      whenExists: options.whenExists ?? 'fail',
      header: headerText(options),
      durable: options.durable ?? 'line',
      sync: options.sync ?? false,
      rotateBytes: options.rotateBytes ?? Number.POSITIVE_INFINITY,
      batchMs: options.batchMs ?? 20,
      batchBytes: options.batchBytes ?? 64 * 1024,
    })
  }

  /** The files written so far, in order. Check them together. */
  get paths(): readonly string[] {
    return this.#file.paths
  }

  /**
   * A client: one sequential requester. The name is made unique to this run. Throws when the name was taken
   * before.
   */
  client(name: string): RecordingClient {
    if (typeof name !== 'string' || name === '')
      throw new TypeError(`found ${shown(name)} as the name of a client, expected a text`)
    if (this.#clients.has(name)) {
      throw new Error(
        `the client ${JSON.stringify(name)} exists already: give each concurrent requester its own name`,
      )
    }
    this.#clients.add(name)
    return new RecordingClient(`${name}@${this.run}`, {
      host: this.host,
      nowNs,
      nextId: () => `${this.run}-${++this.#ids}`,
      open: (line) => this.#file.write(line),
      close: (line) => {
        if (!this.#file.isClosed) this.#file.write(line)
      },
      isRefusal: (error) => this.#isRefusal(error),
    })
  }

  /** A value that no run ever repeats. */
  uniqueValue(prefix = 'v'): string {
    return `${prefix}-${this.run}-${++this.#values}`
  }

  /**
   * Records that something happened to the store. Call the function it returns when it is over; a mark that never
   * ends stays in the recording as the instant when it began.
   */
  mark(text: string): () => void {
    const startNs = nowNs()
    const line = (endNs?: bigint): string =>
      `{"mark":${JSON.stringify(text)},"start":${startNs}${endNs === undefined ? '' : `,"end":${endNs}`}}`
    // Written at once, so that a crash keeps it; when it ends, a second record with the same start takes its place.
    this.#file.write(line())
    let over = false
    return () => {
      if (over) return
      over = true
      this.#file.write(line(nowNs()))
    }
  }

  /**
   * Records that the store may delete a key by itself from now on: call it before each request that sets a time to
   * live, or where the store may evict. In the recording it is an unsure delete by a client of the store's own.
   */
  mayVanish(key: string): void {
    if (typeof key !== 'string') throw new TypeError(`found ${shown(key)} as a key, expected a string`)
    const [client, host] = [`${STORE_CLIENT}@${this.run}`, this.host].map((name) => JSON.stringify(name))
    const atNs = nowNs()
    this.#file.write(
      `{"client":${client},"host":${host},"op":"delete","key":${JSON.stringify(key)},"start":${atNs},"end":${atNs},"outcome":"unsure"}`,
    )
  }

  /** Hands what is held in a batch to the operating system. */
  flush(): void {
    this.#file.flush()
  }

  /** Flushes to disk and closes. Operations still in flight stay open in the recording: unsure. */
  close(): void {
    this.#file.close()
  }

  #isRefusal(error: unknown): boolean {
    try {
      // A rule that answers a promise, say, has proved nothing.
      return this.#refusedWhen(error) === true
    } catch {
      return false
    }
  }
}

function checkOptions(options: RecorderOptions): void {
  const { path, durable, whenExists, sync, clockErrorNs } = options
  if (typeof path !== 'string' || path === '')
    throw new TypeError(`found ${shown(path)} as path, expected the name of a file`)
  oneOf('durable', durable, ['line', 'batch'])
  oneOf('whenExists', whenExists, ['fail', 'next'])
  if (sync && durable === 'batch')
    throw new TypeError("sync goes with durable: 'line': a batch is not awaited, so neither is its disk")
  if (clockErrorNs !== undefined && (typeof clockErrorNs !== 'bigint' || clockErrorNs < 0n))
    throw new TypeError(
      `found ${shown(clockErrorNs)} as clockErrorNs, expected a bigint of nanoseconds from 0n`,
    )
  for (const name of ['rotateBytes', 'batchMs', 'batchBytes'] as const) {
    const value = options[name]
    if (value !== undefined && !(typeof value === 'number' && value > 0))
      throw new TypeError(`found ${shown(value)} as ${name}, expected a number above 0`)
  }
}

function oneOf(name: string, value: string | undefined, choices: readonly string[]): void {
  if (value !== undefined && !choices.includes(value))
    throw new TypeError(`found ${shown(value)} as ${name}, expected ${choices.join(' or ')}`)
}

function headerText({ title, clockErrorNs, initial, initialUnknown }: RecorderOptions): string {
  const members = ['"history":1']
  if (title !== undefined) members.push(`"title":${valueText(title)}`)
  if (clockErrorNs !== undefined) members.push(`"clockError":${clockErrorNs}`)
  if (initial !== undefined) members.push(`"initial":${valueText(initial)}`)
  if (initialUnknown) members.push('"initialUnknown":true')
  return `{${members.join(',')}}`
}
