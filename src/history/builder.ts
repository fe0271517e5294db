/**
 * Grows the columns of a history, record by record. Knows nothing of JSON; refuses nothing.
 */
import { ByteTable } from './byte-table.js'
import { type History, type InputFile, type Mark, NO_VALUE, UNSURE, type Warning } from './columns.js'
import { type Instant, TimesBuilder } from './times.js'
import { ValueTable } from './values.js'

/** One operation, filled in anew for each record. Ids as in History. */
export interface OperationRow {
  client: number
  /** host id, or -1 for none named */
  host: number
  key: number
  kind: number
  outcome: number
  applied: number
  value: number
  extra: number
  saw: number
  readonly start: Instant
  readonly end: Instant
  hasEnd: boolean
  line: number
}

export class HistoryBuilder {
  readonly clients = new ByteTable()
  readonly hosts = new ByteTable()
  readonly keys = new ByteTable()
  readonly values = new ValueTable()
  readonly times = new TimesBuilder()
  readonly files: InputFile[] = []
  readonly marks: Mark[] = []
  readonly warnings: Warning[] = []
  count = 0
  client = new Int32Array(1024)
  host = new Int32Array(1024)
  key = new Int32Array(1024)
  kind = new Uint8Array(1024)
  outcome = new Uint8Array(1024)
  applied = new Uint8Array(1024)
  value = new Int32Array(1024)
  extra = new Int32Array(1024)
  hasEnd = new Uint8Array(1024)
  line = new Uint32Array(1024)
  saw: Int32Array | undefined
  closeLine: Uint32Array | undefined
  closeFile: Int32Array | undefined

  /** Adds an operation and returns its index. */
  push(row: OperationRow): number {
    const i = this.count
    if (i === this.client.length) this.#grow()
    this.count++
    this.client[i] = row.client
    this.host[i] = row.host >= 0 ? row.host : -1 - row.client
    this.key[i] = row.key
    this.kind[i] = row.kind
    this.outcome[i] = row.outcome
    this.applied[i] = row.applied
    this.value[i] = row.value
    this.extra[i] = row.extra
    this.hasEnd[i] = row.hasEnd ? 1 : 0
    this.line[i] = row.line
    if (row.saw !== NO_VALUE) this.setSaw(i, row.saw)
    this.times.push(row.start, row.hasEnd ? row.end : row.start)
    return i
  }

  setSaw(i: number, value: number): void {
    this.saw ??= new Int32Array(this.client.length).fill(NO_VALUE)
    this.saw[i] = value
  }

  /** Notes where the closing half of operation `i` stands. */
  setClose(i: number, file: number, line: number, fileOfOpen: number): void {
    this.closeLine ??= new Uint32Array(this.client.length)
    this.closeLine[i] = line
    if (file !== fileOfOpen && !this.closeFile) {
      this.closeFile = new Int32Array(this.client.length).fill(-1)
    }
    if (this.closeFile) this.closeFile[i] = file
  }

  #grow(): void {
    const size = this.client.length * 2
    this.client = longer(this.client, new Int32Array(size))
    this.host = longer(this.host, new Int32Array(size))
    this.key = longer(this.key, new Int32Array(size))
    this.kind = longer(this.kind, new Uint8Array(size))
    this.outcome = longer(this.outcome, new Uint8Array(size))
    this.applied = longer(this.applied, new Uint8Array(size))
    this.value = longer(this.value, new Int32Array(size))
    this.extra = longer(this.extra, new Int32Array(size))
    this.hasEnd = longer(this.hasEnd, new Uint8Array(size))
    this.line = longer(this.line, new Uint32Array(size))
    if (this.saw) this.saw = longer(this.saw, new Int32Array(size).fill(NO_VALUE))
    if (this.closeLine) this.closeLine = longer(this.closeLine, new Uint32Array(size))
    if (this.closeFile) this.closeFile = longer(this.closeFile, new Int32Array(size).fill(-1))
  }

  /** The finished history. An operation that never closed must be unsure by now. */
  finish(facts: Pick<History, 'title' | 'clockErrorNs' | 'initial' | 'initialUnknown'>): History {
    return {
      count: this.count,
      client: this.client,
      host: this.host,
      key: this.key,
      kind: this.kind,
      outcome: this.outcome,
      applied: this.applied,
      value: this.value,
      extra: this.extra,
      saw: this.saw,
      times: this.times,
      hasEnd: this.hasEnd,
      line: this.line,
      closeLine: this.closeLine,
      closeFile: this.closeFile,
      clients: this.clients,
      hosts: this.hosts,
      keys: this.keys,
      values: this.values,
      files: this.files,
      marks: this.marks,
      warnings: this.warnings,
      ...facts,
    }
  }
}

/** A row to fill in. */
export function emptyRow(): OperationRow {
  return {
    client: 0,
    host: -1,
    key: 0,
    kind: 0,
    outcome: UNSURE,
    applied: 1,
    value: NO_VALUE,
    extra: NO_VALUE,
    saw: NO_VALUE,
    start: { seconds: 0, nanos: 0 },
    end: { seconds: 0, nanos: 0 },
    hasEnd: false,
    line: 0,
  }
}

function longer<A extends Int32Array | Uint8Array | Uint32Array>(old: A, larger: A): A {
  larger.set(old)
  return larger
}
