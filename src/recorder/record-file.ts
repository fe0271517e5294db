/**
 * The file that records go to: handed to the operating system line by line before a request is sent, or in
 * batches; cut into further files by size.
 */
import { closeSync, fsyncSync, openSync, writeSync } from 'node:fs'
import { dirname } from 'node:path'

export interface RecordFileOptions {
  /** the first file; the next ones are numbered before the ending: run.ndjson, run-2.ndjson, … Never overwrites. */
  readonly path: string
  /** `path` exists already: an error, or the next number that is free */
  readonly whenExists: 'fail' | 'next'
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

/** Files with a batch to write when the process ends by itself or by an error. A kill leaves no time for it. */
const unwritten = new Set<RecordFile>()
process.on('exit', () => {
  for (const file of unwritten) file.tryFlush()
})

export class RecordFile {
  readonly #options: RecordFileOptions
  readonly #paths: string[] = []
  #number = 0
  #descriptor = -1
  #bytes = 0
  #batch: string[] = []
  #batchBytes = 0
  #timer: NodeJS.Timeout | undefined
  #closed = false
  #failure: Error | undefined

  /** Begins the first file. Throws when it cannot be made. */
  constructor(options: RecordFileOptions) {
    this.#options = options
    this.#begin()
  }

  /** The files written so far. */
  get paths(): readonly string[] {
    return this.#paths
  }

  get isClosed(): boolean {
    return this.#closed
  }

  /**
   * Takes one line, without its end. In `line` mode it has been handed over when this returns. Throws when the
   * recorder is closed or anything could not be written, now or before: a line after a lost one would hide the loss.
   */
  write(line: string): void {
    if (this.#closed) throw new Error('this recorder is closed: open a new one, which takes new client names')
    if (this.#failure) throw this.#failure
    const text = `${line}\n`
    if (this.#options.durable === 'line') {
      this.#put(text)
      if (this.#options.sync) this.#attempt(() => fsyncSync(this.#descriptor))
      return
    }
    this.#batch.push(text)
    this.#batchBytes += text.length
    if (this.#batchBytes >= this.#options.batchBytes) this.flush()
    else if (!this.#timer) {
      unwritten.add(this)
      this.#timer = setTimeout(() => this.tryFlush(), this.#options.batchMs)
    }
  }

  /** Hands over what a batch holds. Throws when it cannot. */
  flush(): void {
    clearTimeout(this.#timer)
    this.#timer = undefined
    unwritten.delete(this)
    if (this.#failure) throw this.#failure
    if (this.#batch.length === 0) return
    const text = this.#batch.join('')
    this.#batch = []
    this.#batchBytes = 0
    this.#put(text)
  }

  /** Flushes where there is nobody to throw at: the next write throws instead. */
  tryFlush(): void {
    try {
      this.flush()
    } catch {
      // Kept as the failure.
    }
  }

  /** Flushes, waits for the disk and closes. Throws when anything could not be written. */
  close(): void {
    if (this.#closed) return
    try {
      this.flush()
      this.#attempt(() => fsyncSync(this.#descriptor))
    } finally {
      this.#closed = true
      closeSync(this.#descriptor)
    }
  }

  #put(text: string): void {
    if (this.#bytes >= this.#options.rotateBytes) this.#attempt(() => this.#rotate())
    this.#attempt(() => this.#append(text))
  }

  #append(text: string): void {
    const bytes = Buffer.from(text)
    for (let at = 0; at < bytes.length; ) at += writeSync(this.#descriptor, bytes, at)
    this.#bytes += bytes.length
  }

  #rotate(): void {
    // On disk before what follows it: no closing half may survive without its opening half.
    fsyncSync(this.#descriptor)
    const old = this.#descriptor
    this.#begin()
    closeSync(old)
  }

  /** A half written line is the last one: nothing may follow it. */
  #attempt(job: () => void): void {
    try {
      job()
    } catch (error) {
      const path = this.#paths.at(-1)
      const message = `cannot write the recording ${path}, which ends here: ${(error as Error).message}`
      this.#failure = new Error(message, { cause: error })
      throw this.#failure
    }
  }

  #begin(): void {
    const { path, header, sync, whenExists } = this.#options
    for (;;) {
      const number = ++this.#number
      const name = number === 1 ? path : path.replace(/(\.ndjson)?$/, `-${number}$1`)
      try {
        this.#descriptor = openSync(name, 'ax')
        this.#paths.push(name)
        break
      } catch (error) {
        if ((error as NodeJS.ErrnoException).code !== 'EEXIST') throw error
        if (number === 1 && whenExists === 'fail') {
          throw new Error(
            `${name} exists already and is not written over: name another file, or say whenExists: 'next'`,
          )
        }
      }
    }
    this.#bytes = 0
    this.#append(`${header}\n`)
    if (sync) syncFolder(dirname(path))
  }
}

/** Makes the name of a new file outlast a power cut, where the system lets one open folders. */
function syncFolder(path: string): void {
  if (process.platform === 'win32') return
  const folder = openSync(path, 'r')
  try {
    fsyncSync(folder)
  } finally {
    closeSync(folder)
  }
}
