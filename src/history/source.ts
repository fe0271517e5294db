/**
 * Where histories come from: files, standard input, text. The only part of reading that touches the system.
 */
import { closeSync, createReadStream, openSync, readSync } from 'node:fs'
import { stat } from 'node:fs/promises'
import { Readable } from 'node:stream'
import { constants, createGunzip } from 'node:zlib'
import { InputError, type InputProblem } from './problems.js'

/** Bytes that can be read from the start as often as needed. */
export interface ByteSource {
  /** as given by the user; `-` for standard input */
  readonly name: string
  /** bytes before decompression, where that is known before reading */
  readonly sizeBytes?: number
  /**
   * The bytes, decompressed. A chunk may be overwritten once the next is asked for. Throws InputError when they
   * cannot be read.
   */
  chunks(): AsyncIterable<Uint8Array>
}

const CHUNK = 1 << 20
/** Chunks between two turns for others. */
const BREATHE = 16

/**
 * A file, plain or gzip (by its first two bytes). What is no regular file, a pipe say, is kept as it is read, so
 * that evidence can be fetched from it again. Throws InputError when there is no such file or it is a folder.
 */
export async function fileSource(path: string): Promise<ByteSource> {
  const found = await stat(path).catch((error: NodeJS.ErrnoException) => {
    throw unreadable(path, error)
  })
  if (found.isDirectory()) {
    throw new InputError([
      {
        code: 'not-a-file',
        file: path,
        found: 'a folder',
        expected: 'a file',
        advice: 'name the files in it',
      },
    ])
  }
  if (!found.isFile()) return remembered(path, () => createReadStream(path, { highWaterMark: CHUNK }))
  return { name: path, sizeBytes: found.size, chunks: () => decompressed(path, () => readFile(path)) }
}

/** Standard input, or another stream, kept as it is read. */
export function standardInputSource(stream: Readable = process.stdin): ByteSource {
  return remembered('-', () => stream)
}

/** A text or bytes in memory. */
export function textSource(name: string, text: string | Uint8Array): ByteSource {
  const bytes = typeof text === 'string' ? new TextEncoder().encode(text) : text
  return { name, sizeBytes: bytes.length, chunks: () => decompressed(name, () => Readable.from([bytes])) }
}

/**
 * The bytes of a regular file, in one buffer used again and again: a chunk is good until the next is asked for.
 * Read synchronously, which is many times quicker than a trip to the thread pool a chunk; now and then others
 * have their turn.
 */
async function* readFile(path: string): AsyncGenerator<Uint8Array> {
  const file = attempt(path, () => openSync(path, 'r'))
  const buffer = Buffer.allocUnsafeSlow(CHUNK)
  try {
    for (let chunk = 1; ; chunk++) {
      const bytes = attempt(path, () => readSync(file, buffer, 0, CHUNK, null))
      if (bytes === 0) return
      yield buffer.subarray(0, bytes)
      if (chunk % BREATHE === 0) await new Promise((resolve) => setImmediate(resolve))
    }
  } finally {
    closeSync(file)
  }
}

function attempt<T>(path: string, action: () => T): T {
  try {
    return action()
  } catch (error) {
    throw unreadable(path, error as NodeJS.ErrnoException)
  }
}

/** Reads a stream once, as far as somebody asks, and answers later reads from memory. One reader at a time. */
function remembered(name: string, open: () => Readable): ByteSource {
  const kept: Uint8Array[] = []
  let stream: (Readable & Partial<Record<'ref' | 'unref', () => void>>) | undefined
  let rest: AsyncIterator<Uint8Array> | undefined
  let isOver = false
  async function* raw(): AsyncGenerator<Uint8Array> {
    stream?.ref?.()
    try {
      for (let i = 0; ; i++) {
        if (i === kept.length) {
          if (isOver) return
          stream ??= open()
          rest ??= stream[Symbol.asyncIterator]()
          const next = await rest.next()
          isOver = next.done === true
          if (isOver) return
          kept.push(next.value)
        }
        yield kept[i]
      }
    } catch (error) {
      throw unreadable(name, error as NodeJS.ErrnoException)
    } finally {
      // Whoever stops early must not keep the process waiting for the writer of a pipe.
      if (!isOver) stream?.unref?.()
    }
  }
  return { name, chunks: () => decompressed(name, raw) }
}

/** Unpacks a gzip stream, told by its first two bytes; passes others through. */
async function* decompressed(
  name: string,
  open: () => AsyncIterable<Uint8Array>,
): AsyncGenerator<Uint8Array> {
  const chunks = open()[Symbol.asyncIterator]()
  try {
    const first: Uint8Array[] = []
    // The two bytes may come one by one.
    while (first.reduce((sum, { length }) => sum + length, 0) < 2) {
      const next = await chunks.next()
      if (next.done) break
      // Kept only while the next one is asked for, if this one was a single byte.
      first.push(next.value.length < 2 ? new Uint8Array(next.value) : next.value)
    }
    const [one, two] = Buffer.concat(first.map((chunk) => chunk.subarray(0, 2)))
    if (one === 0x1f && two === 0x8b) {
      await chunks.return?.()
      yield* gunzipped(name, open)
      return
    }
    yield* first
    for (let next = await chunks.next(); !next.done; next = await chunks.next()) yield next.value
  } finally {
    // Whoever stops early must not leave the file open.
    await chunks.return?.()
  }
}

/**
 * The unpacked bytes of a gzip stream, of one member or several. `open` reads it from the start, again where need be.
 * Throws InputError where it is cut short (all that is there is given first), damaged, or goes on behind padding.
 */
async function* gunzipped(name: string, open: () => AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array> {
  let given = 0
  try {
    for await (const chunk of unpacked(name, open(), false)) {
      given += chunk.length
      yield chunk
    }
  } catch (error) {
    if (!isZlibError(error)) throw error
    // Of a stream cut short, all that is there is read before it is refused.
    if (isCutShort(error)) {
      let skip = given
      for await (const chunk of unpacked(name, open(), true)) {
        if (skip < chunk.length) yield chunk.subarray(skip)
        skip = Math.max(0, skip - chunk.length)
      }
    }
    throw new InputError([gzipProblem(name, error)])
  }
}

/** The unpacked bytes. `cut`: the stream may stop anywhere. */
async function* unpacked(
  name: string,
  packed: AsyncIterable<Uint8Array>,
  cut: boolean,
): AsyncGenerator<Uint8Array> {
  const gunzip = createGunzip({ chunkSize: CHUNK, ...(cut ? { finishFlush: constants.Z_SYNC_FLUSH } : {}) })
  const tail = new Tail(packed)
  const input = Readable.from(tail.chunks(() => gunzip.bytesWritten))
  input.on('error', (error) => gunzip.destroy(error))
  input.pipe(gunzip)
  try {
    for await (const chunk of gunzip) yield chunk as Uint8Array
    if (await tail.hasData(gunzip.bytesWritten)) throw new InputError([trailingProblem(name)])
  } finally {
    input.destroy()
  }
}

/**
 * Feeds a gzip stream and knows what it left over: unpacking stops without a word at zeros after a member, which are
 * padding only when nothing but zeros follows.
 */
class Tail {
  readonly #source: AsyncIterator<Uint8Array>
  /** chunks that may not be unpacked yet, and where each begins */
  #recent: { at: number; bytes: Uint8Array }[] = []
  #end = 0

  constructor(source: AsyncIterable<Uint8Array>) {
    this.#source = source[Symbol.asyncIterator]()
  }

  /** The chunks, each with bytes of its own, since the stream queues them. */
  async *chunks(consumed: () => number): AsyncGenerator<Uint8Array> {
    try {
      for (let bytes = await this.#next(); bytes; bytes = await this.#next()) {
        const done = consumed()
        this.#recent = this.#recent.filter((chunk) => chunk.at + chunk.bytes.length > done)
        yield bytes
      }
    } finally {
      await this.#source.return?.()
    }
  }

  /** Whether anything but zeros stands after the bytes that were unpacked. */
  async hasData(consumed: number): Promise<boolean> {
    const isData = ({ at, bytes }: { at: number; bytes: Uint8Array }): boolean =>
      bytes.subarray(Math.max(0, consumed - at)).some((byte) => byte !== 0)
    // A chunk that the stream asked for may come while this waits for the next one.
    for (let isMore = true; isMore; isMore = (await this.#next()) !== undefined) {
      if (this.#recent.some(isData)) return true
      this.#recent = []
    }
    return this.#recent.some(isData)
  }

  async #next(): Promise<Uint8Array | undefined> {
    const next = await this.#source.next()
    if (next.done) return undefined
    const bytes = Buffer.from(next.value)
    this.#recent.push({ at: this.#end, bytes })
    this.#end += bytes.length
    return bytes
  }
}

function isZlibError(error: unknown): error is NodeJS.ErrnoException {
  return (
    error instanceof Error &&
    /^(Z_|ERR_.*ZLIB|ERR_TRAILING)/.test(String((error as NodeJS.ErrnoException).code))
  )
}

function isCutShort(error: NodeJS.ErrnoException): boolean {
  return error.code === 'Z_BUF_ERROR'
}

function trailingProblem(name: string): InputProblem {
  return {
    code: 'bad-gzip',
    file: name,
    found: 'more data after the zeros that end the gzip stream',
    expected: 'a whole gzip stream, or several one after the other',
    advice: 'copy the file again, or unpack its parts by themselves',
  }
}

function gzipProblem(name: string, error: NodeJS.ErrnoException): InputProblem {
  const cut = isCutShort(error)
  return {
    code: cut ? 'gzip-cut-short' : 'bad-gzip',
    file: name,
    found: cut ? 'a gzip stream that is cut short' : `a damaged gzip stream (${error.message})`,
    expected: 'a whole gzip stream',
    advice: 'copy the file again, or unpack what there is of it and check that',
  }
}

function unreadable(name: string, error: NodeJS.ErrnoException): InputError {
  if (error instanceof InputError) return error
  const found =
    error.code === 'ENOENT'
      ? 'no such file'
      : error.code === 'EACCES'
        ? 'a file without permission to read it'
        : error.message
  return new InputError([{ code: 'unreadable', file: name, found, expected: 'a file that can be read' }])
}
