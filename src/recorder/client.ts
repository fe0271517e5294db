/**
 * One recording client: wraps the requests of one sequential requester.
 */
import { LINE_LIMIT } from '../history/lines.js'
import { type RecordableValue, shown, valueText, wholeNumberText } from './values.js'

/** What a client needs of its recorder. */
export interface ClientHooks {
  readonly host: string
  nowNs(): bigint
  nextId(): string
  /** Takes the opening half. Throws when it cannot be written: then the request is not sent. */
  open(line: string): void
  /** Takes the closing half. After the recorder was closed it drops it: the operation stays open, unsure. */
  close(line: string): void
  /** Whether an error proves that nothing happened. Never throws. */
  isRefusal(error: unknown): boolean
}

/** What a cas came to. */
export interface CasAnswer {
  readonly applied: boolean
  /** what was found instead, where the store says */
  readonly saw?: RecordableValue
}

/** What may be said with any operation. */
export interface OperationOptions {
  /** fields of your own, kept and shown back as evidence: a trace id, the node that was asked */
  readonly fields?: Readonly<Record<string, RecordableValue>>
}

/** What may be said with a write. */
export interface WriteOptions extends OperationOptions {
  /** the value, read earlier, that this write was computed from; null: the absence of one */
  readonly basis?: RecordableValue
}

const OWN_FIELDS = new Set(
  'id client host op key value by expect applied saw basis start end outcome mark history error'.split(' '),
)

export class RecordingClient {
  /** as recorded: the name asked for, and the run */
  readonly name: string
  readonly #hooks: ClientHooks
  readonly #opening: string
  #busy = false

  constructor(name: string, hooks: ClientHooks) {
    this.name = name
    this.#hooks = hooks
    this.#opening = `"client":${JSON.stringify(name)},"host":${JSON.stringify(hooks.host)}`
  }

  /** Records a read; `request` answers the value, null for absence. Its errors are recorded and passed on. */
  async read<T extends RecordableValue>(
    key: string,
    request: () => Promise<T>,
    options: OperationOptions = {},
  ): Promise<T> {
    return this.#run('read', key, '', request, (value) => `,"value":${valueText(value)}`, options)
  }

  /** Records a write of `value`. `basis`: the value, read earlier, that it was computed from. */
  async write<T>(
    key: string,
    value: RecordableValue,
    request: () => Promise<T>,
    options: WriteOptions = {},
  ): Promise<T> {
    const from = options.basis === undefined ? '' : `,"basis":${valueText(options.basis)}`
    return this.#run('write', key, `,"value":${valueText(value)}${from}`, request, () => '', options)
  }

  /** Records an increment; where the store returns the count after it, `request` answers that, else undefined. */
  async increment<T extends bigint | number | undefined>(
    key: string,
    by: bigint | number,
    request: () => Promise<T>,
    options: OperationOptions = {},
  ): Promise<T> {
    const fields = `,"by":${wholeNumberText('the size of an increment', by)}`
    return this.#run(
      'increment',
      key,
      fields,
      request,
      (count) =>
        count === undefined ? '' : `,"value":${wholeNumberText('the count after an increment', count)}`,
      options,
    )
  }

  /** Records a compare-and-set; `request` answers whether it was applied and, if the store says, what it saw. */
  async cas<T extends CasAnswer>(
    key: string,
    expect: RecordableValue,
    value: RecordableValue,
    request: () => Promise<T>,
    options: OperationOptions = {},
  ): Promise<T> {
    const fields = `,"expect":${valueText(expect)},"value":${valueText(value)}`
    return this.#run('cas', key, fields, request, casText, options)
  }

  /** Records a delete. */
  async delete<T>(key: string, request: () => Promise<T>, options: OperationOptions = {}): Promise<T> {
    return this.#run('delete', key, '', request, () => '', options)
  }

  async #run<T>(
    op: string,
    key: string,
    fields: string,
    request: () => Promise<T>,
    answerText: (answer: T) => string,
    options: OperationOptions,
  ): Promise<T> {
    if (typeof key !== 'string') throw new TypeError(`found ${shown(key)} as a key, expected a string`)
    if (this.#busy) {
      throw new Error(
        `the client ${JSON.stringify(this.name)} has a request in flight: one at a time a client; give each concurrent requester a client of its own`,
      )
    }
    const { open, close, nextId, nowNs, isRefusal } = this.#hooks
    const rest = `${this.#opening},"op":"${op}","key":${JSON.stringify(key)}${fields}${ownFieldsText(options)}`
    checkLength(rest)
    const id = nextId()
    this.#busy = true
    try {
      open(`{"id":"${id}",${rest},"start":${nowNs()}}`)
      let answer: T
      try {
        answer = await request()
      } catch (error) {
        const endNs = nowNs()
        const outcome = isRefusal(error) ? 'refused' : 'unsure'
        try {
          close(`{"id":"${id}","end":${endNs},"outcome":"${outcome}","error":${errorText(error)}}`)
        } catch {
          // The operation stays open, which is unsure too; the next request says why it cannot be recorded.
        }
        throw error
      }
      const endNs = nowNs()
      let more: string
      try {
        more = answerText(answer)
        checkLength(more)
      } catch (error) {
        // An answer that cannot be recorded exactly is no answer to hold the store to.
        close(`{"id":"${id}","end":${endNs},"outcome":"unsure","error":${errorText(error)}}`)
        throw error
      }
      close(`{"id":"${id}","end":${endNs}${more}}`)
      return answer
    } finally {
      this.#busy = false
    }
  }
}

function casText(answer: CasAnswer): string {
  const applied: unknown = answer?.applied
  if (typeof applied !== 'boolean') {
    throw new TypeError(
      `found ${shown(applied)} as applied in the answer of a cas, expected { applied: true } or { applied: false }`,
    )
  }
  if (applied) return ',"applied":true'
  return `,"applied":false${answer.saw === undefined ? '' : `,"saw":${valueText(answer.saw)}`}`
}

function ownFieldsText({ fields }: OperationOptions): string {
  if (fields === undefined) return ''
  let text = ''
  for (const [name, value] of Object.entries(fields)) {
    if (OWN_FIELDS.has(name))
      throw new TypeError(`the field ${JSON.stringify(name)} is the format's own: take another name`)
    text += `,${JSON.stringify(name)}:${valueText(value)}`
  }
  return text
}

/** Readers refuse longer lines; with room for the members that come on top. */
function checkLength(text: string): void {
  const room = LINE_LIMIT - 1024
  if (text.length * 3 > room && Buffer.byteLength(text) > room)
    throw new TypeError('found a record of over 16 MiB, which no reader takes; record a digest of the value')
}

/** What went wrong, for whoever reads the evidence. */
function errorText(error: unknown): string {
  const text = error instanceof Error ? `${error.name}: ${error.message}` : shown(error)
  return JSON.stringify(text.length > 200 ? `${text.slice(0, 199)}…` : text)
}
