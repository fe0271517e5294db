/**
 * The file that records go to: handed to the operating system line by line before a request is sent, or in
 * batches; cut into further files by size.
 */
import { closeSync, fsyncSync, openSync, writeSync } from 'node:fs'

export interface RecordFileOptions {
  /** the first file; the next ones are numbered before the ending: run.ndjson, run-2.ndjson, … Never overwrites. */
  readonly path: string
  /** first line of every file */
  readonly header: string
  /** `line`: the operating system has a line before its request goes out. `batch`: within the batch's bounds */
  readonly durable: 'line' | 'batch'
  /** `line` only: also wait for the disk, so that a power cut loses nothing */
  readonly sync: boolean
  /** a new file is begun after so many bytes; Infinity: never */
  readonly rotateBytes: number
  /** `batch`: written at the latest after so many milliseconds or bytes */
  readonly batchMs: number
  readonly batchBytes: number
}

export class RecordFile {
  readonly #options: RecordFileOptions
  readonly #paths: string[] = []
  #descriptor = -1
  #bytes = 0
  #batch: string[] = []
  #batchBytes = 0
  #timer: NodeJS.Timeout | undefined
  #closed = false

  constructor(options: RecordFileOptions) {
    this.#options = options
    this.#begin()
  }

  /** The files written so far. */
  get paths(): readonly string[] {
    return this.#paths
  }

  /** Takes one line, without its end. In `line` mode it has been handed over when this returns. */
  write(line: string): void {
    if (this.#closed) throw new Error('this recorder is closed: open a new one, which takes new client names')
    const text = `${line}\n`
    if (this.#options.durable === 'line') {
      this.#put(text)
      if (this.#options.sync) fsyncSync(this.#descriptor)
      return
    }
    this.#batch.push(text)
    this.#batchBytes += text.length
    if (this.#batchBytes >= this.#options.batchBytes) this.flush()
    else this.#timer ??= setTimeout(() => this.flush(), this.#options.batchMs)
  }

  /** Hands over what a batch holds. */
  flush(): void {
    clearTimeout(this.#timer)
    this.#timer = undefined
    if (this.#batch.length === 0) return
    const text = this.#batch.join('')
    this.#batch = []
    this.#batchBytes = 0
    this.#put(text)
  }

  /** Flushes, waits for the disk and closes. */
  close(): void {
    if (this.#closed) return
    this.flush()
    this.#closed = true
    fsyncSync(this.#descriptor)
    closeSync(this.#descriptor)
  }

  #put(text: string): void {
    if (this.#bytes >= this.#options.rotateBytes) {
      closeSync(this.#descriptor)
      this.#begin()
    }
    const bytes = Buffer.from(text)
    for (let at = 0; at < bytes.length; ) at += writeSync(this.#descriptor, bytes, at)
    this.#bytes += bytes.length
  }

  #begin(): void {
    const { path, header } = this.#options
    const number = this.#paths.length + 1
    const name = number === 1 ? path : path.replace(/(\.ndjson)?$/, `-${number}$1`)
    this.#descriptor = openSync(name, 'ax')
    this.#paths.push(name)
    this.#bytes = 0
    this.#put(`${header}\n`)
  }
}
