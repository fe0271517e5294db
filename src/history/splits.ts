/**
 * Joins the two halves of split operations, which may stand in any order and in different files.
 */
import type { HistoryBuilder } from './builder.js'
import { ByteTable } from './byte-table.js'
import { ACKED, CAS, INCREMENT, NO_VALUE, READ } from './columns.js'
import type { InputProblem } from './problems.js'
import { type Instant, instantNs } from './times.js'

export interface HalfPlace {
  readonly file: number
  readonly fileName: string
  readonly line: number
}

/** A closing half. */
export interface Close {
  readonly end: Instant
  readonly outcome: number
  readonly applied: boolean
  /** value ids, NO_VALUE where not given */
  readonly value: number
  readonly saw: number
  readonly place: HalfPlace
}

const UNSEEN = 0
const OPEN = 1
const CLOSED = 2

export class Splits {
  readonly ids = new ByteTable()
  readonly #builder: HistoryBuilder
  /** id → UNSEEN (only a close came), OPEN or CLOSED */
  #state = new Uint8Array(1024)
  /** id → its operation */
  #operation = new Int32Array(1024)
  /** closes whose open has not come yet, by id */
  readonly #waiting = new Map<number, Close>()

  constructor(builder: HistoryBuilder) {
    this.#builder = builder
  }

  /** What is wrong with using this id for an operation, if anything. */
  trouble(id: number, isOpen: boolean): string | undefined {
    if (id < this.#state.length && this.#state[id] !== UNSEEN) return 'an id that no other operation has'
    if (!isOpen && this.#waiting.delete(id))
      return 'an id without a closing half elsewhere: this operation has its end'
    return undefined
  }

  /** Notes an operation with this id; joins its close where that came first. */
  add(id: number, operation: number, isOpen: boolean, place: HalfPlace): InputProblem | undefined {
    this.#reserve(id)
    this.#operation[id] = operation
    this.#state[id] = isOpen ? OPEN : CLOSED
    const close = this.#waiting.get(id)
    if (!close || !isOpen) return undefined
    this.#waiting.delete(id)
    return this.#join(id, close, place.file)
  }

  /** Joins a closing half, or keeps it until its open comes. */
  close(id: number, close: Close, fileOfOpen: (operation: number) => number): InputProblem | undefined {
    this.#reserve(id)
    if (this.#state[id] === CLOSED || this.#waiting.has(id)) {
      return problem(
        close.place,
        'misused-id',
        `a second closing half of id ${this.#quoted(id)}`,
        'one closing half an id',
      )
    }
    if (this.#state[id] === OPEN) return this.#join(id, close, fileOfOpen(this.#operation[id]))
    this.#waiting.set(id, close)
    return undefined
  }

  /** The closes whose open never came. */
  unopened(): InputProblem[] {
    return [...this.#waiting].map(([id, close]) =>
      problem(
        close.place,
        'close-without-open',
        `a closing half of id ${this.#quoted(id)}, which no line opens`,
        'the line that opens it, in one of the files',
        'give all files of the recording at once',
      ),
    )
  }

  #join(id: number, close: Close, fileOfOpen: number): InputProblem | undefined {
    const builder = this.#builder
    const i = this.#operation[id]
    this.#state[id] = CLOSED
    const startNs = builder.times.startNs(i)
    if (instantNs(close.end) < startNs) {
      return problem(
        close.place,
        'end-before-start',
        `an end ${startNs - instantNs(close.end)} ns before the start in the opening half`,
        'an end at or after the start',
      )
    }
    const kind = builder.kind[i]
    if (close.outcome === ACKED) {
      if (kind === READ) {
        if (close.value === NO_VALUE) {
          return problem(
            close.place,
            'missing-field',
            'an acked read without value',
            'value: what the read returned, null when the key was absent',
          )
        }
        builder.value[i] = close.value
      } else if (kind === INCREMENT) builder.value[i] = close.value
      else if (kind === CAS) {
        builder.applied[i] = close.applied ? 1 : 0
        if (!close.applied && close.saw !== NO_VALUE) builder.setSaw(i, close.saw)
      }
    }
    builder.outcome[i] = close.outcome
    builder.hasEnd[i] = 1
    builder.times.setEnd(i, close.end)
    builder.setClose(i, close.place.file, close.place.line, fileOfOpen)
    return undefined
  }

  #quoted(id: number): string {
    return JSON.stringify(this.ids.name(id))
  }

  #reserve(id: number): void {
    if (id < this.#state.length) return
    const size = Math.max(this.#state.length * 2, id + 1)
    const state = new Uint8Array(size)
    state.set(this.#state)
    this.#state = state
    const operation = new Int32Array(size)
    operation.set(this.#operation)
    this.#operation = operation
  }
}

function problem(
  place: HalfPlace,
  code: string,
  found: string,
  expected: string,
  advice?: string,
): InputProblem {
  return {
    code,
    file: place.fileName,
    line: place.line,
    found,
    expected,
    ...(advice === undefined ? {} : { advice }),
  }
}
