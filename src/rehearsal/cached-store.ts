/**
 * A look-aside cache before a store: a reader asks the cache first, and fills it with what the store answers; a
 * writer writes to the store and then drops the value from the cache. A reader that fetched the old value before a
 * write may fill it in after the writer has dropped it.
 */
import type { FaultRun } from './fault-run.js'
import type { Network } from './network.js'
import type { Answer, Cell, Key, Operation } from './operation.js'
import type { Random } from './random.js'
import type { Scenario } from './scenario-schema.js'
import type { Scheduler } from './scheduler.js'
import type { Store } from './store.js'

export class CachedStore implements Store {
  readonly #store: Store
  readonly #scheduler: Scheduler
  readonly #network: Network
  readonly #random: Random
  readonly #cache: NonNullable<Scenario['store']['cache']>
  /** share of the invalidations that never arrive, by fault */
  readonly losses = new Map<FaultRun, number>()
  readonly #kept = new Map<Key, { readonly cell: Cell; readonly until: number }>()
  /** the fault that lost the last invalidation of a key */
  readonly #missed = new Map<Key, FaultRun>()

  constructor(
    parts: { scheduler: Scheduler; network: Network; random: Random },
    cache: NonNullable<Scenario['store']['cache']>,
    store: Store,
  ) {
    this.#scheduler = parts.scheduler
    this.#network = parts.network
    this.#random = parts.random
    this.#cache = cache
    this.#store = store
  }

  send(operation: Operation, reply: (answer: Answer) => void): void {
    if (!operation.key.isCached) this.#store.send(operation, reply)
    else if (operation.kind === 'read') this.#network.toCache(() => this.#look(operation, reply))
    else this.#store.send(operation, (answer) => this.#changed(operation.key, answer, reply))
  }

  gaveUp(operation: Operation): void {
    this.#store.gaveUp(operation)
  }

  #look(operation: Operation, reply: (answer: Answer) => void): void {
    const { key } = operation
    const kept = this.#kept.get(key)
    if (kept && kept.until > this.#scheduler.now) {
      const { cell } = kept
      const fault = this.#missed.get(key)
      const via = { role: 'cache' as const, ...(fault ? { fault } : {}) }
      this.#network.toCache(() =>
        reply({ type: 'done', node: 'cache', via, cell, found: cell, applied: true }),
      )
      return
    }
    this.#store.send(operation, (answer) => {
      reply(answer)
      if (answer.type === 'refused') return
      this.#network.toCache(() => {
        this.#kept.set(key, { cell: answer.cell, until: this.#scheduler.now + this.#cache.keeps })
        this.#missed.delete(key)
      })
    })
  }

  #changed(key: Key, answer: Answer, reply: (answer: Answer) => void): void {
    if (answer.type === 'refused' || !this.#cache.invalidates) {
      reply(answer)
      return
    }
    for (const [fault, share] of this.losses) {
      if (!this.#random.chance(share)) continue
      if (this.#kept.has(key)) this.#missed.set(key, fault)
      reply(answer)
      return
    }
    this.#network.toCache(() => {
      this.#kept.delete(key)
      this.#missed.delete(key)
      this.#network.toCache(() => reply(answer))
    })
  }
}
