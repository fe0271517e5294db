/**
 * Turns scanned records into rows of the history: which kind of record it is, whether its fields are what they
 * must be, what the defaults are.
 */
import { emptyRow, HistoryBuilder, type OperationRow } from './builder.js'
import {
  ACKED,
  CAS,
  DELETE,
  fileOf,
  INCREMENT,
  KIND_NAMES,
  NO_VALUE,
  NULL_VALUE,
  OUTCOME_NAMES,
  READ,
  UNSURE,
  WRITE,
} from './columns.js'
import { WRITTEN_OUT } from './decimal.js'
import { Headers } from './headers.js'
import { objectMembers } from './object-members.js'
import type { InputProblem } from './problems.js'
import {
  ABSENT,
  F,
  FALSE,
  type FieldName,
  NULL,
  NUMBER,
  OBJECT,
  RecordScanner,
  STRING,
  TRUE,
  TYPE_NAMES,
} from './record-scanner.js'
import { Splits } from './splits.js'
import { likelyUnit, readPlainNs, timeNs, toInstant, type Unit } from './time-text.js'
import { type Instant, instantNs } from './times.js'
import { encodeUtf8 } from './utf8.js'
import { canonicalText, ValueTrouble } from './values.js'

const KIND_BYTES = KIND_NAMES.map((name) => new TextEncoder().encode(name))

/** Where a record stands. */
export interface Place {
  file: number
  fileName: string
  /** 1-based */
  line: number
  /** byte offset of the line's first byte in the scanned array */
  lineStart: number
  /** true for the first record of a file */
  first: boolean
  unit: Unit
}

/** Thrown inside one record; the reader turns it into a problem at its place. */
class Refusal {
  readonly problem: Omit<InputProblem, 'file' | 'line' | 'column'>
  readonly at: number | undefined

  constructor(code: string, at: number | undefined, found: string, expected: string, advice?: string) {
    this.problem = { code, found, expected, ...(advice === undefined ? {} : { advice }) }
    this.at = at
  }
}

export class RecordReader {
  readonly builder = new HistoryBuilder()
  readonly headers = new Headers()
  readonly splits = new Splits(this.builder)
  readonly scanner = new RecordScanner()
  readonly #row: OperationRow = emptyRow()
  #place!: Place
  /** a problem of the other half of a split operation, at its own place */
  #otherHalf: InputProblem | undefined

  /** Reads a line that has been scanned. Returns what is wrong with it, if anything; then nothing was added. */
  read(place: Place): InputProblem | undefined {
    this.#place = place
    this.#otherHalf = undefined
    try {
      this.#record()
      return this.#otherHalf
    } catch (error) {
      if (!(error instanceof Refusal)) throw error
      return {
        ...error.problem,
        file: place.fileName,
        line: place.line,
        ...(error.at === undefined ? {} : { column: error.at - place.lineStart + 1 }),
      }
    }
  }

  #record(): void {
    const { type } = this.scanner
    if (type[F.op] !== ABSENT) this.#operation()
    else if (type[F.mark] !== ABSENT) this.#mark()
    else if (type[F.history] !== ABSENT) this.#header()
    else if (type[F.id] !== ABSENT) this.#close()
    else {
      throw new Refusal(
        'unknown-record',
        undefined,
        'a record without op, mark, history or id',
        'an operation (op), a mark, a header (history) or the closing half of an operation (id)',
      )
    }
  }

  #header(): void {
    const { scanner } = this
    const place = this.#place
    if (!place.first) {
      throw new Refusal(
        'misplaced-header',
        this.#at('history'),
        'a header',
        'the header on the first line of its file only',
      )
    }
    const version = scanner.type[F.history] === NUMBER ? timeNs(scanner.raw(F.history), 'ns') : undefined
    if (version !== 1n) {
      throw this.#wrong(
        'history',
        'unknown-version',
        'the integer 1',
        'this program reads version 1 of the format',
      )
    }
    const title = this.#optionalString('title')
    const unit = this.#optionalString('unit')
    if (unit !== undefined && unit !== 'ns' && unit !== 'us' && unit !== 'ms' && unit !== 's') {
      throw this.#wrong('unit', 'unknown-unit', '"ns", "us", "ms" or "s"')
    }
    const clockError =
      scanner.type[F.clockError] === ABSENT ? 0n : this.#timeField('clockError', unit ?? 'ns')
    if (clockError < 0n) throw this.#wrong('clockError', 'ill-typed-field', 'a clock error of 0 or more')
    const initialUnknown = this.#optionalBoolean('initialUnknown')
    const initial = this.#initial()
    place.unit = unit ?? 'ns'
    const contradiction = this.headers.add(
      { title, clockErrorNs: clockError, initialUnknown, initial },
      { file: place.fileName, line: place.line },
    )
    if (contradiction) {
      throw new Refusal(
        'contradicting-headers',
        undefined,
        contradiction.found,
        contradiction.expected,
        'make the headers agree',
      )
    }
  }

  /** Members of `initial`: key → value id. */
  #initial(): Map<string, number> {
    const { scanner } = this
    const initial = new Map<string, number>()
    if (scanner.type[F.initial] === ABSENT) return initial
    if (scanner.type[F.initial] !== OBJECT)
      throw this.#wrong('initial', 'ill-typed-field', 'an object of keys and their values')
    for (const { name, value } of objectMembers(this.#canonical('initial'))!) {
      initial.set(JSON.parse(name) as string, this.builder.values.internText(value))
    }
    return initial
  }

  #mark(): void {
    const text = this.#string('mark')
    const startNs = this.#timeField('start', this.#place.unit)
    const { type } = this.scanner
    const endNs =
      type[F.end] === ABSENT || type[F.end] === NULL ? startNs : this.#timeField('end', this.#place.unit)
    if (endNs < startNs) throw this.#wrong('end', 'end-before-start', 'an end at or after the start')
    this.builder.marks.push({ text, startNs, endNs, file: this.#place.file, line: this.#place.line })
  }

  #operation(): void {
    const { scanner, builder } = this
    const { type } = scanner
    const row = this.#row
    const kind = this.#kind()
    row.kind = kind
    row.line = this.#place.line
    row.client = this.#name('client', builder.clients)
    row.key = this.#name('key', builder.keys)
    row.host = type[F.host] === ABSENT ? -1 : this.#name('host', builder.hosts)
    this.#time('start', row.start)
    row.hasEnd = type[F.end] !== ABSENT && type[F.end] !== NULL
    if (row.hasEnd) {
      this.#time('end', row.end)
      this.#checkOrder(row.start, row.end)
    }
    const outcome = this.#outcome()
    const isOpen = type[F.id] !== ABSENT && !row.hasEnd
    if (!row.hasEnd && outcome !== -1 && outcome !== UNSURE) {
      throw this.#wrong(
        'outcome',
        'no-end',
        `"unsure" or no outcome where the request has no end`,
        'record when the answer came, or leave the outcome out',
      )
    }
    row.outcome = row.hasEnd ? (outcome === -1 ? ACKED : outcome) : UNSURE
    row.applied = 1
    row.value = NO_VALUE
    row.extra = NO_VALUE
    row.saw = NO_VALUE
    this.#details(row, isOpen)

    if (type[F.id] === ABSENT) {
      builder.push(row)
      return
    }
    const id = this.#name('id', this.splits.ids)
    const trouble = this.splits.trouble(id, isOpen)
    if (trouble) throw this.#wrong('id', 'misused-id', trouble)
    this.#otherHalf = this.splits.add(id, builder.push(row), isOpen, this.#halfPlace())
  }

  #halfPlace(): { file: number; fileName: string; line: number } {
    const { file, fileName, line } = this.#place
    return { file, fileName, line }
  }

  /** The fields that depend on the kind. */
  #details(row: OperationRow, isOpen: boolean): void {
    const { kind } = row
    if (kind === READ) {
      if (!isOpen && row.outcome === ACKED)
        row.value = this.#valueField(
          'value',
          'the value that the read returned, null when the key was absent',
        )
    } else if (kind === WRITE) {
      row.value = this.#valueField('value', 'the new value')
      if (this.scanner.type[F.basis] !== ABSENT) row.extra = this.#valueField('basis', 'a value')
    } else if (kind === CAS) {
      row.value = this.#valueField('value', 'the new value')
      row.extra = this.#valueField('expect', 'the value that must be there, null for absence')
      if (!isOpen) this.#answer(row)
    } else if (kind === INCREMENT) {
      row.extra = this.#by()
      if (!isOpen && row.outcome === ACKED && this.scanner.type[F.value] !== ABSENT) {
        row.value = this.#valueField('value', 'the count after it')
      }
    } else if (kind === DELETE) row.value = NULL_VALUE
  }

  /** What an acked cas answered. */
  #answer(row: OperationRow): void {
    const applied = this.#optionalBoolean('applied') ?? true
    if (row.outcome !== ACKED) return
    row.applied = applied ? 1 : 0
    if (!applied && this.scanner.type[F.saw] !== ABSENT) row.saw = this.#valueField('saw', 'a value')
  }

  #close(): void {
    const { scanner, splits } = this
    const { type } = scanner
    const id = this.#name('id', splits.ids)
    if (type[F.start] !== ABSENT) {
      throw new Refusal(
        'missing-field',
        undefined,
        'a record with id and start but no op',
        'op, which says what the operation does',
      )
    }
    if (type[F.end] === ABSENT || type[F.end] === NULL) {
      throw new Refusal(
        'missing-field',
        undefined,
        'a closing half without end',
        'end, the time when the answer arrived',
      )
    }
    const end: Instant = { seconds: 0, nanos: 0 }
    this.#time('end', end)
    const outcome = this.#outcome()
    const close = {
      end,
      outcome: outcome === -1 ? ACKED : outcome,
      applied: this.#optionalBoolean('applied') ?? true,
      value: type[F.value] === ABSENT ? NO_VALUE : this.#valueField('value', 'a value'),
      saw: type[F.saw] === ABSENT ? NO_VALUE : this.#valueField('saw', 'a value'),
      place: this.#halfPlace(),
    }
    this.#otherHalf = splits.close(id, close, (operation) => fileOf(this.builder, operation))
  }

  // Fields

  #kind(): number {
    const { scanner } = this
    if (scanner.type[F.op] === STRING) {
      const from = scanner.from[F.op]
      const length = scanner.to[F.op] - from
      for (let kind = 0; kind < KIND_BYTES.length; kind++) {
        const name = KIND_BYTES[kind]
        if (name.length !== length) continue
        let i = 0
        while (i < length && scanner.bytes[from + i] === name[i]) i++
        if (i === length) return kind
      }
      if (scanner.special[F.op]) {
        const kind = (KIND_NAMES as readonly string[]).indexOf(scanner.text(F.op))
        if (kind >= 0) return kind
      }
    }
    throw this.#wrong('op', 'unknown-op', '"read", "write", "increment", "cas" or "delete"')
  }

  /** The outcome, or -1 where none is given. */
  #outcome(): number {
    const { scanner } = this
    if (scanner.type[F.outcome] === ABSENT) return -1
    if (scanner.type[F.outcome] === STRING) {
      const outcome = OUTCOME_NAMES.indexOf(scanner.text(F.outcome) as (typeof OUTCOME_NAMES)[number])
      if (outcome >= 0) return outcome
    }
    throw this.#wrong('outcome', 'unknown-outcome', '"acked", "refused" or "unsure"')
  }

  #name(field: FieldName, table: { intern(bytes: Uint8Array, from: number, to: number): number }): number {
    const { scanner } = this
    const f = F[field]
    if (scanner.type[f] !== STRING) throw this.#missingOrWrong(field, 'a string')
    if (scanner.special[f] === 0) return table.intern(scanner.bytes, scanner.from[f], scanner.to[f])
    const bytes = encodeUtf8(scanner.text(f))
    return table.intern(bytes, 0, bytes.length)
  }

  #string(field: FieldName): string {
    if (this.scanner.type[F[field]] !== STRING) throw this.#missingOrWrong(field, 'a string')
    return this.scanner.text(F[field])
  }

  #optionalString(field: FieldName): string | undefined {
    return this.scanner.type[F[field]] === ABSENT ? undefined : this.#string(field)
  }

  #optionalBoolean(field: FieldName): boolean | undefined {
    const type = this.scanner.type[F[field]]
    if (type === ABSENT) return undefined
    if (type !== TRUE && type !== FALSE) throw this.#wrong(field, 'ill-typed-field', 'true or false')
    return type === TRUE
  }

  /** The whole number of an increment. */
  #by(): number {
    const { scanner, builder } = this
    if (scanner.type[F.by] === ABSENT) return builder.values.internText('1')
    if (scanner.type[F.by] === NUMBER) {
      const id = this.#valueField('by', 'a whole number')
      if (builder.values.integer(id) !== undefined) return id
    }
    throw this.#wrong('by', 'by-not-whole', 'a whole number')
  }

  #valueField(field: FieldName, expected: string): number {
    const { scanner, builder } = this
    const f = F[field]
    const type = scanner.type[f]
    if (type === ABSENT) throw this.#missingOrWrong(field, expected)
    if (type === NULL) return NULL_VALUE
    if (scanner.special[f] === 0 && type < OBJECT) {
      const quote = type === STRING ? 1 : 0
      const from = scanner.from[f] - quote
      const to = scanner.to[f] + quote
      // Longer numbers have another canonical spelling.
      if (type !== NUMBER || to - from <= WRITTEN_OUT)
        return builder.values.internBytes(scanner.bytes, from, to)
    }
    return builder.values.internText(this.#canonical(field))
  }

  #canonical(field: FieldName): string {
    try {
      return canonicalText(this.scanner.raw(F[field]))
    } catch (error) {
      if (!(error instanceof ValueTrouble)) throw error
      throw new Refusal(error.code, this.#at(field), `${error.message} in ${field}`, error.expected)
    }
  }

  #time(field: 'start' | 'end', into: Instant): void {
    const { scanner } = this
    const f = F[field]
    const digits = scanner.to[f] - scanner.from[f]
    // 19 digits that begin with at most 8 lie below 2^63, and fewer always do.
    if (
      scanner.type[f] === NUMBER &&
      scanner.special[f] === 0 &&
      this.#place.unit === 'ns' &&
      (digits < 19 || (digits === 19 && scanner.bytes[scanner.from[f]] < 0x39))
    ) {
      readPlainNs(scanner.bytes, scanner.from[f], scanner.to[f], into)
      return
    }
    const { seconds, nanos } = toInstant(this.#timeField(field, this.#place.unit))
    into.seconds = seconds
    into.nanos = nanos
  }

  /** A time or span in nanoseconds. */
  #timeField(field: FieldName, unit: Unit): bigint {
    const { scanner } = this
    const f = F[field]
    if (scanner.type[f] !== NUMBER && scanner.type[f] !== STRING) {
      throw this.#missingOrWrong(field, 'a time: a number or a string of one')
    }
    const text = scanner.text(f)
    const ns = timeNs(text, unit)
    if (typeof ns === 'bigint') return ns
    if (ns === 'no-number') throw this.#wrong(field, 'ill-typed-field', 'a time: a number or a string of one')
    if (ns === 'too-fine') {
      throw this.#wrong(
        field,
        'too-fine',
        'a time of whole nanoseconds',
        `round it to ${9 - { ns: 9, us: 6, ms: 3, s: 0 }[unit]} decimals of ${unit}`,
      )
    }
    const likely = likelyUnit(text)
    throw this.#wrong(
      field,
      'time-out-of-range',
      'a time within 2^63 ns of the epoch (years 1678 to 2262)',
      likely && likely !== unit
        ? `the unit here is ${unit}: with "unit":"${likely}" in the header it would be a date of this century`
        : `the unit here is ${unit}; name the right one in the header`,
    )
  }

  #checkOrder(start: Instant, end: Instant): void {
    if (end.seconds > start.seconds || (end.seconds === start.seconds && end.nanos >= start.nanos)) return
    const early = instantNs(start) - instantNs(end)
    throw this.#wrong('end', 'end-before-start', `an end at or after the start (it is ${early} ns before it)`)
  }

  // Refusals

  #at(field: FieldName): number {
    const quote = this.scanner.type[F[field]] === STRING ? 1 : 0
    return this.scanner.from[F[field]] - quote
  }

  #wrong(field: FieldName, code: string, expected: string, advice?: string): Refusal {
    const { scanner } = this
    if (scanner.type[F[field]] === ABSENT) return this.#missingOrWrong(field, expected)
    const raw = scanner.raw(F[field])
    const found = `${field} ${raw.length > 80 ? `${raw.slice(0, 80)}… (${raw.length} characters)` : raw}`
    return new Refusal(code, this.#at(field), found, expected, advice)
  }

  #missingOrWrong(field: FieldName, expected: string): Refusal {
    const type = this.scanner.type[F[field]]
    if (type === ABSENT) {
      return new Refusal('missing-field', undefined, `no ${field}`, `${field}: ${expected}`)
    }
    return new Refusal('ill-typed-field', this.#at(field), `${TYPE_NAMES[type]} as ${field}`, expected)
  }
}
