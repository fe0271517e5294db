/**
 * One recording client: wraps the requests of one sequential requester.
 */
import { type RecordableValue, valueText } from './values.js'

/** What a client needs of its recorder. */
export interface ClientHooks {
  readonly host: string
  nowNs(): bigint
  nextId(): string
  write(line: string): void
  isRefusal(error: unknown): boolean
}

/** What a cas came to. */
export interface CasAnswer {
  readonly applied: boolean
  /** what was found instead, where the store says */
  readonly saw?: RecordableValue
}

export class RecordingClient {
  readonly name: string
  readonly #hooks: ClientHooks
  #busy = false

  constructor(name: string, hooks: ClientHooks) {
    this.name = name
    this.#hooks = hooks
  }

  /** Records a read; `request` answers the value, null for absence. Its errors are recorded and passed on. */
  read<T extends RecordableValue>(key: string, request: () => Promise<T>): Promise<T> {
    return this.#run('read', key, '', request, (value) => `,"value":${valueText(value)}`)
  }

  /** Records a write of `value`. `basis`: the value, read earlier, that it was computed from. */
  write<T>(
    key: string,
    value: RecordableValue,
    request: () => Promise<T>,
    { basis }: { basis?: RecordableValue } = {},
  ): Promise<T> {
    const from = basis === undefined ? '' : `,"basis":${valueText(basis)}`
    return this.#run('write', key, `,"value":${valueText(value)}${from}`, request, () => '')
  }

  /** Records an increment; where the store returns the count after it, `request` answers that, else undefined. */
  increment<T extends bigint | number | undefined>(
    key: string,
    by: bigint | number,
    request: () => Promise<T>,
  ): Promise<T> {
    if (typeof by === 'number' && !Number.isInteger(by))
      throw new TypeError(`found ${by}, expected a whole number`)
    return this.#run('increment', key, `,"by":${valueText(by)}`, request, (count) =>
      count === undefined ? '' : `,"value":${valueText(count)}`,
    )
  }

  /** Records a compare-and-set; `request` answers whether it was applied and, if the store says, what it saw. */
  cas<T extends CasAnswer>(
    key: string,
    expect: RecordableValue,
    value: RecordableValue,
    request: () => Promise<T>,
  ): Promise<T> {
    const fields = `,"expect":${valueText(expect)},"value":${valueText(value)}`
    return this.#run('cas', key, fields, request, ({ applied, saw }) =>
      applied ? ',"applied":true' : `,"applied":false${saw === undefined ? '' : `,"saw":${valueText(saw)}`}`,
    )
  }

  /** Records a delete. */
  delete<T>(key: string, request: () => Promise<T>): Promise<T> {
    return this.#run('delete', key, '', request, () => '')
  }

  async #run<T>(
    op: string,
    key: string,
    fields: string,
    request: () => Promise<T>,
    answerFields: (answer: T) => string,
  ): Promise<T> {
    if (this.#busy) {
      throw new Error(
        `the client ${JSON.stringify(this.name)} has a request in flight: one at a time a client; give each concurrent requester a client of its own`,
      )
    }
    this.#busy = true
    const { host, nextId, nowNs, write, isRefusal } = this.#hooks
    const id = nextId()
    const close = (more: string): void => write(`{"id":"${id}","end":${nowNs()}${more}}`)
    try {
      write(
        `{"id":"${id}","client":${JSON.stringify(this.name)},"host":${JSON.stringify(host)},"op":"${op}","key":${JSON.stringify(key)}${fields},"start":${nowNs()}}`,
      )
      let answer: T
      try {
        answer = await request()
      } catch (error) {
        close(`,"outcome":"${isRefusal(error) ? 'refused' : 'unsure'}"`)
        throw error
      }
      let more: string
      try {
        more = answerFields(answer)
      } catch (error) {
        // An answer that cannot be recorded exactly is no answer to hold the store to.
        close(',"outcome":"unsure"')
        throw error
      }
      close(more)
      return answer
    } finally {
      this.#busy = false
    }
  }
}
