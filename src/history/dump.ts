/**
 * A dump of the store taken after the run: what each key held at one time, added to a history as reads by a client of
 * its own (format.md, "A dump of the store").
 */

import { emptyRow, type HistoryBuilder } from './builder.js'
import { ACKED, type InputFile, NO_VALUE, READ } from './columns.js'
import { visitLines } from './lines.js'
import type { InputProblem } from './problems.js'
import { ABSENT, F, FALSE, NUMBER, RecordScanner, STRING, TRUE } from './record-scanner.js'
import type { ByteSource } from './source.js'
import { timeNs, toInstant, UNITS, type Unit } from './time-text.js'
import { encodeUtf8 } from './utf8.js'
import { canonicalText, ValueTrouble } from './values.js'

/** The client that a dump reads as. */
export const DUMP_CLIENT = 'the dump of the store'

/**
 * Reads a dump into a builder that holds the whole history. Keys that the history does not have are passed over;
 * in a complete dump a key of the history that is missing was absent. Problems go to `report`.
 */
export async function readDump(
  builder: HistoryBuilder,
  source: ByteSource,
  report: (problem: InputProblem) => void,
): Promise<void> {
  const file: InputFile = {
    name: source.name,
    bytes: 0,
    unitNs: 1n,
    firstOperation: builder.count,
    isDump: true,
  }
  builder.files.push(file)
  const dump = new DumpReader(builder, source.name, report)
  let bytes = 0
  await visitLines(
    source,
    {
      line: (chunk, from, to, line) => dump.line(chunk, from, to, line),
      tooLong: (line) => dump.refuse(line, 'a line of over 16 MiB', 'one key and its value a line'),
    },
    (n) => {
      bytes += n
    },
  )
  dump.end()
  builder.files[builder.files.length - 1] = { ...file, bytes: source.sizeBytes ?? bytes }
}

class DumpReader {
  readonly #builder: HistoryBuilder
  readonly #name: string
  readonly #report: (problem: InputProblem) => void
  readonly #scanner = new RecordScanner()
  readonly #row = emptyRow()
  /** keys of the history that the dump has not named */
  readonly #missing: Uint8Array
  readonly #keys: number
  #hasHeader = false
  #isComplete = false
  #headerLine = 1

  constructor(builder: HistoryBuilder, name: string, report: (problem: InputProblem) => void) {
    this.#builder = builder
    this.#name = name
    this.#report = report
    this.#keys = builder.keys.size
    this.#missing = new Uint8Array(this.#keys).fill(1)
    const client = encodeUtf8(DUMP_CLIENT)
    Object.assign(this.#row, {
      kind: READ,
      outcome: ACKED,
      hasEnd: true,
      client: builder.clients.intern(client, 0, client.length),
    })
  }

  refuse(line: number, found: string, expected: string): false {
    this.#report({ code: 'bad-dump', file: this.#name, line, found, expected })
    return false
  }

  line(bytes: Uint8Array, from: number, to: number, line: number): boolean {
    const scanner = this.#scanner
    if (bytes.subarray(from, to).every((c) => c === 0x20 || c === 0x09 || c === 0x0d)) return true
    if (!scanner.scan(bytes, from, to))
      return this.refuse(line, 'what is no JSON object', scanner.failure.expected)
    return this.#hasHeader ? this.#entry(line) : this.#header(line)
  }

  #header(line: number): boolean {
    const { type } = this.#scanner
    const scanner = this.#scanner
    if (type[F.dump] !== NUMBER || timeNs(scanner.raw(F.dump), 'ns') !== 1n) {
      return this.refuse(
        line,
        'no header',
        '{"dump":1,"time":…,"unit":"ns","complete":true} on the first line',
      )
    }
    const unit = type[F.unit] === ABSENT ? 'ns' : type[F.unit] === STRING ? scanner.text(F.unit) : ''
    if (!(UNITS as readonly string[]).includes(unit))
      return this.refuse(line, `unit ${scanner.raw(F.unit)}`, '"ns", "us", "ms" or "s"')
    const time =
      type[F.time] === NUMBER || type[F.time] === STRING
        ? timeNs(scanner.text(F.time), unit as Unit)
        : 'no-number'
    if (typeof time !== 'bigint')
      return this.refuse(
        line,
        type[F.time] === ABSENT ? 'no time' : `time ${scanner.raw(F.time)}`,
        'the time of the dump, within 2^63 ns and of whole nanoseconds',
      )
    if (type[F.complete] !== ABSENT && type[F.complete] !== TRUE && type[F.complete] !== FALSE) {
      return this.refuse(line, `complete ${scanner.raw(F.complete)}`, 'true or false')
    }
    const instant = toInstant(time)
    Object.assign(this.#row.start, instant)
    Object.assign(this.#row.end, instant)
    this.#isComplete = type[F.complete] === TRUE
    this.#hasHeader = true
    this.#headerLine = line
    return true
  }

  #entry(line: number): boolean {
    const scanner = this.#scanner
    const { type } = scanner
    if (type[F.key] !== STRING) return this.refuse(line, 'no key', 'key, a string')
    if (type[F.value] === ABSENT) return this.refuse(line, 'no value', 'value, null where the key was absent')
    const name = encodeUtf8(scanner.text(F.key))
    const key = this.#builder.keys.intern(name, 0, name.length)
    if (key >= this.#keys) return true
    if (this.#missing[key] === 0)
      return this.refuse(line, `the key ${scanner.raw(F.key)} twice`, 'each key once')
    this.#missing[key] = 0
    try {
      this.#push(key, this.#builder.values.internText(canonicalText(scanner.raw(F.value))), line)
    } catch (error) {
      if (!(error instanceof ValueTrouble)) throw error
      return this.refuse(line, `${error.message} in value`, error.expected)
    }
    return true
  }

  /** What a complete dump does not name was absent: the header says so. */
  end(): void {
    if (!this.#hasHeader) {
      this.refuse(1, 'an empty dump', '{"dump":1,"time":…} on the first line')
      return
    }
    if (!this.#isComplete) return
    const used = new Uint8Array(this.#keys)
    for (let i = 0; i < this.#builder.count; i++)
      if (this.#builder.key[i] < this.#keys) used[this.#builder.key[i]] = 1
    for (let key = 0; key < this.#keys; key++) {
      if (this.#missing[key] && used[key]) this.#push(key, 0, this.#headerLine)
    }
  }

  #push(key: number, value: number, line: number): void {
    Object.assign(this.#row, { key, value, line, host: -1, extra: NO_VALUE, saw: NO_VALUE })
    this.#builder.push(this.#row)
  }
}
