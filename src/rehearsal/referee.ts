/**
 * Says what befell each operation, from what the simulation knows: whose change was thrown away or carried out twice,
 * and whose answer lacks what clients had already been told.
 *
 * Where nothing was lost or repeated and no answer is stale, the store's own order of changes explains everything that
 * clients saw: then every promise holds, whatever the checker may think.
 */
import type { FaultRun } from './fault-run.js'
import type { Answer, Cell, Key, Operation, Via } from './operation.js'
import { causedBy, type Hit, type Outcome, type Output } from './output.js'
import type { Scenario } from './scenario-schema.js'
import type { Scheduler } from './scheduler.js'
import { Tally } from './tally.js'
import { Zones } from './zones.js'

type Done = Extract<Answer, { type: 'done' }>

export class Referee {
  readonly #scheduler: Scheduler
  readonly #output: Output
  /** what makes replication slow now, if anything does */
  readonly #slowness: () => FaultRun | undefined
  readonly #zones = new Map<Key, Zones>()
  readonly #tallies = new Map<Key, Tally>()
  /** the last thing that threw a change of the key away, made one twice or answered what was out of date */
  readonly #harm = new Map<Key, { cause: string; fault?: number }>()

  constructor(
    scheduler: Scheduler,
    output: Output,
    keys: ReadonlyMap<Key, Cell>,
    { returnsCount, timeout }: Scenario['workload'],
    slowness: () => FaultRun | undefined,
  ) {
    this.#scheduler = scheduler
    this.#output = output
    this.#slowness = slowness
    for (const [key, { version }] of keys) {
      if (key.kind === 'sailing') this.#tallies.set(key, new Tally(returnsCount))
      else this.#zones.set(key, new Zones(version, timeout))
    }
  }

  begun(operation: Operation): void {
    this.#tallies.get(operation.key)?.begun(operation)
  }

  /** A leader carried it out; maybe for the second time. */
  carriedOut(operation: Operation): void {
    operation.timesDone++
    if (operation.timesDone > 1) {
      this.#harm.set(operation.key, { cause: 'retry' })
      this.#hit(operation, { effect: 'repeated', cause: 'retry', times: operation.timesDone })
    }
    if (!operation.isOpen && operation.timesDone === 1)
      this.#hit(operation, { effect: 'late', ...this.#hindrance(operation) })
  }

  /** What a leader had carried out will be thrown away, and who asks elsewhere does not see it. */
  doomed({ key }: Operation, fault: FaultRun): void {
    this.#harm.set(key, causedBy(fault))
  }

  /** What a leader had carried out was thrown away. */
  lost(operation: Operation, fault: FaultRun): void {
    operation.timesDone--
    operation.lostBy = fault
    this.#harm.set(operation.key, causedBy(fault))
    this.#hit(operation, { effect: 'lost', ...causedBy(fault) })
  }

  /** An operation ends for its client. Call before its line is written. */
  ended(operation: Operation, outcome: Outcome, answer: Done | undefined): void {
    this.#judge(operation, outcome, answer)
    operation.close()
  }

  #judge(operation: Operation, outcome: Outcome, answer: Done | undefined): void {
    if (outcome !== 'acked') this.#tallies.get(operation.key)?.gaveUp(operation)
    if (outcome === 'unsure') {
      this.#hit(operation, {
        effect: 'unsure',
        ...this.#hindrance(operation),
        ...(operation.kind === 'read' ? {} : { carriedOut: operation.timesDone > 0 }),
      })
      return
    }
    if (outcome === 'refused' || !answer) return
    const isProvable = this.#contradicts(operation, answer)
    const isBehind = this.#tells(operation) && answer.found.rank < operation.knownAtStart.rank
    const { key } = operation
    const provable = isProvable !== false
    if (isProvable === 'over') this.#hit(operation, { effect: 'over', ...this.#harmTo(key), provable })
    else if (isBehind) {
      const cause = this.#whyStale(operation, answer.via)
      this.#harm.set(key, cause)
      this.#hit(operation, { effect: 'stale', ...cause, provable })
    } else if (isProvable) {
      const effect = key.kind === 'sailing' ? 'short' : 'contradiction'
      this.#hit(operation, { effect, ...this.#harmTo(key), provable })
    }
    const { rank, by } = answer.cell
    if (rank > key.known.rank) key.known = { rank, by }
  }

  /** Whether the answer says what the store held. */
  #tells({ kind, key }: Operation): boolean {
    if (kind === 'increment') return this.#tallies.get(key)!.returnsCount
    return kind === 'read' || kind === 'cas'
  }

  /** Whether the answers so far, this one with them, prove that something is wrong. */
  #contradicts(operation: Operation, answer: Done): boolean | 'over' {
    const { key } = operation
    const now = this.#scheduler.now
    return (
      this.#tallies.get(key)?.ended(operation, answer.cell) ??
      this.#zones.get(key)!.ended(operation, answer.found.version, answer.applied, now)
    )
  }

  /** Who answered with what was out of date, or whose doing it is that the store itself held no better. */
  #whyStale({ knownAtStart, key }: Operation, { role, fault }: Via): { cause: string; fault?: number } {
    const lostBy = knownAtStart.by?.lostBy
    switch (role) {
      case 'deposed-leader':
      case 'former-owner':
        return causedBy(fault!)
      case 'cache':
        return fault ? causedBy(fault) : { cause: 'cache' }
      case 'quorum':
        return { cause: 'small-quorum' }
      case 'follower':
        return lostBy ? causedBy(lostBy) : { cause: 'follower-read' }
      case 'leader':
        return lostBy ? causedBy(lostBy) : this.#harmTo(key)
    }
  }

  #harmTo(key: Key): { cause: string; fault?: number } {
    return this.#harm.get(key) ?? { cause: 'unknown' }
  }

  #hit(operation: Operation, hit: Hit): void {
    this.#output.hit(operation, hit, this.#scheduler.now)
  }

  /** What kept the answer from its client. */
  #hindrance({ hinderedBy }: Operation): { cause: string; fault?: number } {
    const fault = hinderedBy ?? this.#slowness()
    return fault ? causedBy(fault) : { cause: 'slow' }
  }
}
