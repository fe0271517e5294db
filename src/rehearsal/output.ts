/**
 * The history and the truth as text, piece by piece. An operation is recorded when it ends; what the truth says of it
 * is written once its line is known.
 */

import type { Clocks } from './clocks.js'
import type { FaultRun } from './fault-run.js'
import { clientName, hostName } from './names.js'
import type { Answer, Cell, Key, Operation } from './operation.js'
import type { HitEffect, TruthHit } from './truth-schema.js'

/** Text that has been made since the last piece. */
export interface Piece {
  readonly history: string
  readonly truth: string
}

/** What befell an operation, for the truth to tell. */
export type Hit = Pick<TruthHit, 'effect' | 'cause' | 'fault' | 'times' | 'provable' | 'carriedOut'>

export type Outcome = 'acked' | 'refused' | 'unsure'

export class Output {
  readonly #clocks: Clocks
  readonly #returnsCount: boolean
  #history: string[] = []
  #truth: string[] = []
  /** lines of the history so far */
  #lines = 0
  #size = 0
  readonly outcomes: Record<Outcome, number> = { acked: 0, refused: 0, unsure: 0 }
  /** operations hit, by effect and cause */
  readonly hits = new Map<string, { effect: HitEffect; cause: string; count: number }>()

  /** `returnsCount`: whether increments answer the count after them */
  constructor(clocks: Clocks, returnsCount: boolean) {
    this.#clocks = clocks
    this.#returnsCount = returnsCount
  }

  /** Characters that wait to be taken. */
  get size(): number {
    return this.#size
  }

  take(): Piece {
    const piece = { history: this.#history.join(''), truth: this.#truth.join('') }
    this.#history = []
    this.#truth = []
    this.#size = 0
    return piece
  }

  /** A line of the history that is no operation. */
  write(record: Readonly<Record<string, unknown>>): void {
    this.#line(JSON.stringify(record))
  }

  /** From and to in true time; without `to` an instant. */
  mark(text: string, from: number, to: number | undefined): void {
    const end = to === undefined ? '' : `,"end":${this.#clocks.text(to)}`
    this.#line(`{"mark":${JSON.stringify(text)},"start":${this.#clocks.text(from)}${end}}`)
  }

  /** An operation that ends now. `answer`: what the client made of it, if it came. */
  operation(operation: Operation, outcome: Outcome, now: number, answer: Answer | undefined): void {
    const { client, kind, key, by, expect, version, start } = operation
    const host = this.#clocks.hostOf(client)
    const fields = [
      `"client":"${clientName(client)}","host":"${hostName(host)}","op":"${kind}","key":${JSON.stringify(key.name)}`,
    ]
    const done = outcome === 'acked' && answer?.type === 'done' ? answer : undefined
    if (kind === 'read') {
      if (done) fields.push(`"value":${heldValue(key, done.cell)}`)
    } else if (kind === 'increment') {
      fields.push(`"by":${by}`)
      if (done && this.#returnsCount) fields.push(`"value":${done.cell.count}`)
    } else if (kind === 'write') fields.push(`"value":${version!.text}`)
    else if (kind === 'cas') {
      fields.push(`"expect":${expect},"value":${version!.text}`)
      if (done && !done.applied) fields.push(`"applied":false,"saw":${done.found.version.text}`)
    }
    fields.push(`"start":${this.#clocks.stamp(host, start)},"end":${this.#clocks.stamp(host, now)}`)
    if (outcome !== 'acked') fields.push(`"outcome":"${outcome}"`)
    if (answer) fields.push(`"node":"${answer.node}"`)
    this.#line(`{${fields.join(',')}}`)
    this.outcomes[outcome]++
    operation.line = this.#lines
    for (const hit of operation.pending) this.#truthLine(hit(operation.line))
    operation.pending.length = 0
  }

  /** A line of the truth that speaks of no operation. */
  state(record: Readonly<Record<string, unknown>>): void {
    this.#truthLine(JSON.stringify(record))
  }

  /** Something befell an operation at this time. */
  hit(operation: Operation, hit: Hit, now: number): void {
    const { effect, cause } = hit
    const name = `${effect} ${cause}`
    const counted = this.hits.get(name) ?? { effect, cause, count: 0 }
    counted.count++
    this.hits.set(name, counted)
    const text = (line: number): string => {
      const truth: TruthHit = {
        line,
        client: clientName(operation.client),
        op: operation.kind,
        key: operation.key.name,
        ...hit,
        at: this.#clocks.text(now),
      }
      return JSON.stringify(truth)
    }
    if (operation.line > 0) this.#truthLine(text(operation.line))
    else operation.pending.push(text)
  }

  #line(text: string): void {
    this.#lines++
    this.#history.push(`${text}\n`)
    this.#size += text.length
  }

  #truthLine(text: string): void {
    this.#truth.push(`${text}\n`)
    this.#size += text.length
  }
}

/** Names a fault as a cause. */
export function causedBy({ spec, number }: FaultRun): { cause: string; fault: number } {
  return { cause: spec.fault, fault: number }
}

/** What a read returns, as JSON. A counter that nobody has incremented is absent. */
function heldValue(key: Key, { by, count, version }: Cell): string {
  return key.kind === 'sailing' && by !== undefined ? String(count) : version.text
}
