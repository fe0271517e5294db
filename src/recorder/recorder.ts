/**
 * Records what the clients of an application or driver ask of a store, as a history that `misread check` reads.
 */
import { randomBytes } from 'node:crypto'
import { RecordingClient } from './client.js'
import { nowNs } from './clock.js'
import { RecordFile } from './record-file.js'
import { type RecordableValue, valueText } from './values.js'

export interface RecorderOptions {
  /** where to write, `run.ndjson`; must not exist yet */
  readonly path: string
  readonly title?: string
  /** how far this process's clock may be from true time, in nanoseconds; matters once several hosts record */
  readonly clockErrorNs?: bigint
  /** values of keys before the recording */
  readonly initial?: Readonly<Record<string, RecordableValue>>
  /** the store was not empty, and what it held is not known */
  readonly initialUnknown?: boolean
  /** name of this process's clock; default one of its own. All clients of one process share it */
  readonly host?: string
  /**
   * `line` (default): the opening half of an operation is with the operating system before its request is sent,
   * so that killing this process loses no request. `batch`: lines are held for up to 20 ms or 64 KiB; a crash loses those.
   */
  readonly durable?: 'line' | 'batch'
  /** with `line`: wait for the disk too, so that a power cut loses no request. Slow. Default false */
  readonly sync?: boolean
  /** begin a new file after so many bytes; default never */
  readonly rotateBytes?: number
  /**
   * True for errors that prove that nothing happened (a refusal). All others are unsure, and so is every error
   * by default.
   */
  readonly refusedWhen?: (error: unknown) => boolean
  /** false: a record does not name the run in its client's name; only for a run whose names you make unique */
  readonly nameRun?: boolean
}

export class Recorder {
  /** names this run; part of every client's name and of unique values, so that no two runs share one */
  readonly run = `${Date.now().toString(36)}${randomBytes(3).toString('hex')}`
  readonly host: string
  readonly #file: RecordFile
  readonly #refusedWhen: (error: unknown) => boolean
  readonly #nameRun: boolean
  readonly #clients = new Set<string>()
  #values = 0
  #ids = 0

  constructor(options: RecorderOptions) {
    this.host = options.host ?? `clock-${this.run}`
    this.#refusedWhen = options.refusedWhen ?? (() => false)
    this.#nameRun = options.nameRun ?? true
    this.#file = new RecordFile({
      path: options.path,
      header: headerText(options),
      durable: options.durable ?? 'line',
      sync: options.sync ?? false,
      rotateBytes: options.rotateBytes ?? Number.POSITIVE_INFINITY,
      batchMs: 20,
      batchBytes: 64 * 1024,
    })
  }

  /** The files written so far, in order. */
  get paths(): readonly string[] {
    return this.#file.paths
  }

  /**
   * A client: one sequential requester. The name is made unique to this run. Throws when the name was taken
   * before.
   */
  client(name: string): RecordingClient {
    const full = this.#nameRun ? `${name}@${this.run}` : name
    if (this.#clients.has(full)) {
      throw new Error(
        `the client ${JSON.stringify(name)} exists already: give each concurrent requester its own name`,
      )
    }
    this.#clients.add(full)
    return new RecordingClient(full, {
      host: this.host,
      nowNs,
      nextId: () => `${this.run}-${++this.#ids}`,
      write: (line) => this.#file.write(line),
      isRefusal: this.#refusedWhen,
    })
  }

  /** A value that no run ever repeats. */
  uniqueValue(prefix = 'v'): string {
    return `${prefix}-${this.run}-${++this.#values}`
  }

  /** Records that something happened to the store. Call the function it returns when it is over. */
  mark(text: string): () => void {
    const startNs = nowNs()
    const line = (endNs?: bigint): string =>
      `{"mark":${JSON.stringify(text)},"start":${startNs}${endNs === undefined ? '' : `,"end":${endNs}`}}`
    // Written at once, so that a crash keeps it; when it ends, a second record carries the span.
    this.#file.write(line())
    let over = false
    return () => {
      if (over) return
      over = true
      this.#file.write(line(nowNs()))
    }
  }

  /** Hands what is held in a batch to the operating system. */
  flush(): void {
    this.#file.flush()
  }

  /** Flushes to disk and closes. Operations still in flight stay open in the recording: unsure. */
  close(): void {
    this.#file.close()
  }
}

function headerText({ title, clockErrorNs, initial, initialUnknown }: RecorderOptions): string {
  const members = ['"history":1']
  if (title !== undefined) members.push(`"title":${JSON.stringify(title)}`)
  if (clockErrorNs !== undefined) members.push(`"clockError":${clockErrorNs}`)
  if (initial !== undefined) members.push(`"initial":${valueText(initial)}`)
  if (initialUnknown) members.push('"initialUnknown":true')
  return `{${members.join(',')}}`
}
