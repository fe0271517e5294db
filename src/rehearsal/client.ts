/**
 * A client: sends one request after the other, may send one again, gives up after a while, and records.
 */
import { clientName } from './names.js'
import { type Answer, type Key, newVersion, Operation } from './operation.js'
import type { Outcome, Output } from './output.js'
import type { Random } from './random.js'
import type { Referee } from './referee.js'
import type { Scenario } from './scenario-schema.js'
import type { Scheduler } from './scheduler.js'
import type { Store } from './store.js'
import type { Vessels } from './vessels.js'

/** Between closing reads, ns: no request begins at the instant that another ends. */
const BREATH = 1000

export interface ClientParts {
  readonly scheduler: Scheduler
  readonly random: Random
  readonly store: Store
  readonly referee: Referee
  readonly output: Output
  readonly vessels: Vessels
  readonly workload: Scenario['workload']
  readonly keys: readonly Key[]
  /** called for each operation that ends */
  readonly onEnd: () => void
}

export class Client {
  readonly #number: number
  readonly #parts: ClientParts
  /** keys that it reads once all is over */
  readonly #closing: Key[]
  /** what it last knew a lease to hold, as JSON */
  readonly #leases = new Map<Key, string>()
  #readNext: Key | undefined
  #leaseNumber = 0

  constructor(number: number, parts: ClientParts, closing: readonly Key[]) {
    this.#number = number
    this.#parts = parts
    this.#closing = closing.slice()
  }

  /** Sends its first request after a pause. */
  begin(): void {
    this.#pause()
  }

  #pause(): void {
    const { scheduler, random, workload } = this.#parts
    scheduler.after(1 + random.exponential(workload.pause), () => this.#next())
  }

  #next(): void {
    const { scheduler, workload } = this.#parts
    if (scheduler.now < workload.lasts) {
      this.#send(this.#choose())
      return
    }
    const opens = workload.lasts + workload.settle
    if (scheduler.now < opens) {
      scheduler.at(opens, () => this.#next())
      return
    }
    const key = this.#closing.shift()
    if (key) this.#send(new Operation(this.#number, scheduler.now, { kind: 'read', key }))
  }

  #choose(): Operation {
    const { random, keys, workload, vessels, scheduler } = this.#parts
    const { now } = scheduler
    const key = this.#readNext ?? random.pick(keys)
    const isRead = this.#readNext !== undefined || random.chance(workload.reads)
    this.#readNext = undefined
    if (isRead) return new Operation(this.#number, now, { kind: 'read', key })
    if (random.chance(workload.readBack)) this.#readNext = key
    switch (key.kind) {
      case 'sailing':
        return new Operation(this.#number, now, { kind: 'increment', key, by: 1 })
      case 'lease': {
        const name = `${clientName(this.#number)} ${++this.#leaseNumber}`
        const expect = this.#leases.get(key) ?? 'null'
        const version = newVersion(JSON.stringify(name))
        return new Operation(this.#number, now, { kind: 'cas', key, expect, version })
      }
      case 'berth': {
        const isDelete = random.chance(workload.deletes)
        const version = newVersion(isDelete ? 'null' : vessels.next())
        return new Operation(this.#number, now, { kind: isDelete ? 'delete' : 'write', key, version })
      }
    }
  }

  #send(operation: Operation): void {
    const { scheduler, store, referee, workload } = this.#parts
    const { retries, timeout } = workload
    const isRetried = retries?.of.includes(operation.kind) ?? false
    let attempts = 0
    referee.begun(operation)
    const attempt = (): void => {
      if (!operation.isOpen) return
      attempts++
      store.send(operation, (answer) => {
        if (!operation.isOpen) return
        // A refusal proves nothing of the attempts before.
        if (answer.type === 'done') this.#end(operation, 'acked', answer)
        else if (attempts === 1) this.#end(operation, 'refused', answer)
      })
      if (isRetried && attempts <= retries!.times)
        scheduler.after(retries!.after, () => {
          if (operation.isOpen) store.gaveUp(operation)
          attempt()
        })
    }
    attempt()
    scheduler.after(timeout, () => {
      if (!operation.isOpen) return
      store.gaveUp(operation)
      this.#end(operation, 'unsure', undefined)
    })
  }

  #end(operation: Operation, outcome: Outcome, answer: Answer | undefined): void {
    const { referee, output, scheduler, onEnd } = this.#parts
    const done = answer?.type === 'done' ? answer : undefined
    referee.ended(operation, outcome, done)
    output.operation(operation, outcome, scheduler.now, answer)
    if (done && operation.key.kind === 'lease') this.#leases.set(operation.key, done.cell.version.text)
    onEnd()
    if (scheduler.now < this.#parts.workload.lasts) this.#pause()
    else scheduler.after(BREATH, () => this.#next())
  }
}
