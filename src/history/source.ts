/**
 * Where histories come from: files, standard input, text. The only part of reading that touches the system.
 */
import { closeSync, createReadStream, openSync, readSync } from 'node:fs'
import { stat } from 'node:fs/promises'
import { Readable } from 'node:stream'
import { createGunzip } from 'node:zlib'
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
  return { name: path, sizeBytes: found.size, chunks: () => decompressed(path, readFile(path)) }
}

/** Standard input, or another stream, kept as it is read. */
export function standardInputSource(stream: Readable = process.stdin): ByteSource {
  return remembered('-', () => stream)
}

/** A text or bytes in memory. */
export function textSource(name: string, text: string | Uint8Array): ByteSource {
  const bytes = typeof text === 'string' ? new TextEncoder().encode(text) : text
  return { name, sizeBytes: bytes.length, chunks: () => decompressed(name, Readable.from([bytes])) }
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

/** Reads a stream once and answers later reads from memory. */
function remembered(name: string, open: () => Readable): ByteSource {
  let kept: Uint8Array[] | undefined
  async function* raw(): AsyncGenerator<Uint8Array> {
    if (kept) {
      yield* kept
      return
    }
    const chunks: Uint8Array[] = []
    try {
      for await (const chunk of open()) {
        chunks.push(chunk)
        yield chunk
      }
    } catch (error) {
      throw unreadable(name, error as NodeJS.ErrnoException)
    }
    kept = chunks
  }
  return { name, chunks: () => decompressed(name, raw()) }
}

/** Unpacks a gzip stream, told by its first two bytes; passes others through. */
async function* decompressed(name: string, raw: AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array> {
  const chunks = raw[Symbol.asyncIterator]()
  try {
    const first: Uint8Array[] = []
    // The two bytes may come one by one.
    while (first.reduce((sum, { length }) => sum + length, 0) < 2) {
      const next = await chunks.next()
      if (next.done) break
      // Kept only while the next one is asked for, if this one was a single byte.
      first.push(next.value.length < 2 ? new Uint8Array(next.value) : next.value)
    }
    async function* all(): AsyncGenerator<Uint8Array> {
      yield* first
      for (let next = await chunks.next(); !next.done; next = await chunks.next()) yield next.value
    }
    const [one, two] = Buffer.concat(first.map((chunk) => chunk.subarray(0, 2)))
    if (one === 0x1f && two === 0x8b) yield* gunzipped(name, all())
    else yield* all()
  } finally {
    // Whoever stops early must not leave the file open.
    await chunks.return?.()
  }
}

async function* gunzipped(name: string, packed: AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array> {
  const gunzip = createGunzip({ chunkSize: CHUNK })
  // The stream queues chunks, so each needs bytes of its own.
  const input = Readable.from(copies(packed))
  input.on('error', (error) => gunzip.destroy(error))
  input.pipe(gunzip)
  try {
    for await (const chunk of gunzip) yield chunk as Uint8Array
  } catch (error) {
    throw isZlibError(error) ? new InputError([gzipProblem(name, error)]) : error
  } finally {
    input.destroy()
  }
}

async function* copies(chunks: AsyncIterable<Uint8Array>): AsyncGenerator<Uint8Array> {
  for await (const chunk of chunks) yield Buffer.from(chunk)
}

function isZlibError(error: unknown): error is NodeJS.ErrnoException {
  return (
    error instanceof Error &&
    /^(Z_|ERR_.*ZLIB|ERR_TRAILING)/.test(String((error as NodeJS.ErrnoException).code))
  )
}

function gzipProblem(name: string, error: NodeJS.ErrnoException): InputProblem {
  const cut = error.code === 'Z_BUF_ERROR'
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
