/**
 * A file that is written piece by piece and appears whole or not at all.
 */
import { randomBytes } from 'node:crypto'
import { once } from 'node:events'
import { createWriteStream, type WriteStream } from 'node:fs'
import { lstat, open, realpath, rename, rm } from 'node:fs/promises'
import type { Writable } from 'node:stream'
import { finished } from 'node:stream/promises'
import { createGzip } from 'node:zlib'
import { UsageError } from './exit.js'

export class WholeOutput {
  readonly #path: string
  readonly #temporary: string
  readonly #force: boolean
  readonly #file: WriteStream
  /** what is written to: the file, or what packs for it */
  readonly #into: Writable
  #error: Error | undefined

  /**
   * Starts a file, gzip where its name ends in .gz, under a temporary name beside it. Throws UsageError where it
   * stands already and `force` is false, where it is no file, and where it is one of `inputs`.
   */
  static async start(path: string, force: boolean, inputs: readonly string[]): Promise<WholeOutput> {
    await refuseExisting(path, force)
    const own = await realpath(path).catch(() => undefined)
    for (const input of inputs) {
      if (own !== undefined && own === (await realpath(input).catch(() => undefined)))
        throw new UsageError(`${path} is an input as well; name another file to write`)
    }
    const temporary = `${path}.${randomBytes(6).toString('hex')}.tmp`
    const file = createWriteStream(temporary, { flags: 'wx' })
    try {
      await once(file, 'open')
    } catch (error) {
      throw cannotWrite(path, error)
    }
    return new WholeOutput(path, temporary, force, file)
  }

  private constructor(path: string, temporary: string, force: boolean, file: WriteStream) {
    this.#path = path
    this.#temporary = temporary
    this.#force = force
    this.#file = file
    const note = (error: Error): void => {
      this.#error ??= error
    }
    file.on('error', note)
    if (!path.endsWith('.gz')) this.#into = file
    else {
      const gzip = createGzip()
      gzip.on('error', note)
      gzip.pipe(file)
      this.#into = gzip
    }
  }

  /** Waits until there is room for more. Throws UsageError when the file cannot be written. */
  async write(text: string): Promise<void> {
    if (this.#error) throw cannotWrite(this.#path, this.#error)
    if (this.#into.write(text)) return
    await new Promise<void>((resolve) => {
      const go = (): void => {
        this.#into.off('drain', go)
        this.#file.off('error', go)
        resolve()
      }
      this.#into.on('drain', go)
      this.#file.on('error', go)
    })
    if (this.#error) throw cannotWrite(this.#path, this.#error)
  }

  /** Gives the file its name. */
  async commit(): Promise<void> {
    try {
      this.#into.end()
      await finished(this.#file)
      if (this.#error) throw this.#error
      const file = await open(this.#temporary)
      await file.sync()
      await file.close()
      await refuseExisting(this.#path, this.#force)
      await rename(this.#temporary, this.#path)
    } catch (error) {
      await this.discard()
      throw error instanceof UsageError ? error : cannotWrite(this.#path, error)
    }
  }

  /** Leaves nothing behind. */
  async discard(): Promise<void> {
    this.#into.destroy()
    this.#file.destroy()
    if (!this.#file.closed) await once(this.#file, 'close').catch(() => {})
    await rm(this.#temporary, { force: true })
  }
}

async function refuseExisting(path: string, force: boolean): Promise<void> {
  const found = await lstat(path).catch((error: NodeJS.ErrnoException) => {
    if (error.code === 'ENOENT') return undefined
    throw cannotWrite(path, error)
  })
  if (!found) return
  if (!found.isFile()) throw new UsageError(`${path} is no regular file; name one to write`)
  if (!force)
    throw new UsageError(`${path} stands already; name another file, or add --force to write over it`)
}

function cannotWrite(path: string, error: unknown): UsageError {
  return new UsageError(`cannot write ${path}: ${(error as Error).message}`)
}
