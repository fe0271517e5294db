/**
 * A store whose regions have leaders: who is asked, and what faults do to it.
 */
import { keyGlob } from '../promises/glob.js'
import type { FaultRun } from './fault-run.js'
import { nodeName } from './names.js'
import type { Network } from './network.js'
import type { Answer, Cell, Key, Operation } from './operation.js'
import type { Random } from './random.js'
import type { Referee } from './referee.js'
import { Region } from './region.js'
import type { FaultSpec, Scenario } from './scenario-schema.js'
import { MS, type Scheduler } from './scheduler.js'
import type { Store } from './store.js'

type Fault<Name extends FaultSpec['fault']> = Extract<FaultSpec, { fault: Name }>

/** A thing that has to wait is tried again so much later. */
const AGAIN = 10 * MS

export interface StoreParts {
  readonly scheduler: Scheduler
  readonly network: Network
  readonly referee: Referee
  readonly random: Random
  readonly store: Scenario['store']
  readonly clients: number
  readonly keys: readonly Key[]
  /** tells the recording what happens to the store; the mark ends now, and began at `from` */
  readonly mark: (text: string, from: number, isInstant?: boolean) => void
}

export class LeaderStore implements Store {
  readonly #parts: StoreParts
  readonly #regions: Region[]

  constructor(parts: StoreParts, cells: readonly Cell[]) {
    this.#parts = parts
    const region = new Region(parts, cells, 0, parts.clients)
    this.#regions = [region]
    for (const key of parts.keys) key.region = region
  }

  send(operation: Operation, reply: (answer: Answer) => void): void {
    const { network, store, random, scheduler } = this.#parts
    const { key, client } = operation
    const { former } = key
    const region = former && scheduler.now < former.until[client] ? former.region : key.region!
    let node = region.believed[client]
    if (operation.kind === 'read' && store.reads === 'followers') {
      const up = region.replicas.map((_, i) => i).filter((i) => !network.stopped[i])
      if (up.length > 0) node = random.pick(up)
    }
    network.toNode(operation, node, () =>
      region.receive(node, operation, (answer) => {
        if (answer.type === 'refused') region.believed[client] = region.leader
        network.toClient(operation, node, () => reply(answer))
      }),
    )
  }

  gaveUp(operation: Operation): void {
    const region = operation.key.region!
    region.believed[operation.client] = region.leader
  }

  /** The leader stops; another node leads after a while; the old one returns as a follower. */
  failover(run: FaultRun, { detect, lasts }: Fault<'failover'>): void {
    const { scheduler, network, mark } = this.#parts
    const node = this.#regions[0].leader
    if (network.stopped[node] || network.cutOff[node]) return
    const from = scheduler.now
    network.stopped[node] = run
    scheduler.after(detect, () => this.#promote(run, node))
    scheduler.after(lasts, () => {
      network.stopped[node] = undefined
      mark(`failover: ${nodeName(node)} stopped`, from)
      this.#catchUp()
    })
  }

  /** The leader is cut off from the other nodes and goes on; they choose another; in the end it steps down. */
  twoLeaders(run: FaultRun, { detect, lasts, stay }: Fault<'two-leaders'>): void {
    const { scheduler, network, random, mark } = this.#parts
    const node = this.#regions[0].leader
    if (network.stopped[node] || network.cutOff[node]) return
    const from = scheduler.now
    network.cutOff[node] = run
    scheduler.after(detect, () => {
      this.#promote(run, node)
      for (const region of this.#regions) {
        region.believed.forEach((believed, client) => {
          if (believed === node && !random.chance(stay)) region.believed[client] = region.leader
        })
      }
    })
    scheduler.after(lasts, () => {
      network.cutOff[node] = undefined
      mark(`two leaders: ${nodeName(node)} cut off from the other nodes`, from)
      this.#catchUp()
    })
  }

  /** Keys get another owner while they are written; once they have arrived from an earlier handover. */
  handover(run: FaultRun, spec: Fault<'handover'>): void {
    const matches = keyGlob(spec.keys)
    const keys = this.#parts.keys.filter(({ name }) => matches(name))
    if (keys.some(({ isMoving }) => isMoving)) {
      this.#parts.scheduler.after(AGAIN, () => this.handover(run, spec))
      return
    }
    for (const key of keys) key.isMoving = true
    for (const region of this.#regions.slice()) {
      const own = new Set(keys.filter((key) => key.region === region))
      if (own.size === 0) continue
      if (spec.sound) this.#handOver(run, region, own, spec)
      else this.#handOverCarelessly(run, region, own, spec)
    }
  }

  nodeStopped(run: FaultRun, { node: number, lasts }: Fault<'node-stopped'>): void {
    const { scheduler, network, mark } = this.#parts
    const node = number - 1
    if (network.stopped[node]) return
    const from = scheduler.now
    network.stopped[node] = run
    scheduler.after(lasts, () => {
      network.stopped[node] = undefined
      mark(`${nodeName(node)} stopped`, from)
      this.#catchUp()
    })
  }

  /** The old owner turns requests away, finishes what it has begun, and only then is the copy taken. */
  #handOver(
    run: FaultRun,
    region: Region,
    keys: ReadonlySet<Key>,
    { copying, staleRoutes }: Fault<'handover'>,
  ): void {
    const { scheduler } = this.#parts
    const from = scheduler.now
    for (const key of keys) region.frozen.add(key)
    const takeOver = (): void => {
      if (!region.isSound() || region.isBusyWith(keys)) {
        scheduler.after(AGAIN, takeOver)
        return
      }
      for (const key of keys) region.closed.add(key)
      this.#open(run, region, keys, region.snapshot(), staleRoutes)
      this.#markHandover(keys, from)
    }
    scheduler.after(copying, takeOver)
  }

  /** The copy is taken first; what is changed until nobody asks the old owner any more is lost. */
  #handOverCarelessly(
    run: FaultRun,
    region: Region,
    keys: ReadonlySet<Key>,
    { copying, staleRoutes }: Fault<'handover'>,
  ): void {
    const { scheduler } = this.#parts
    const from = scheduler.now
    const copy = region.snapshot()
    const move = region.startMove(keys, run)
    scheduler.after(copying, () => {
      region.takenOver(move)
      this.#open(run, region, keys, copy, staleRoutes)
      scheduler.after(staleRoutes, () => {
        region.endMove(move)
        this.#markHandover(keys, from)
      })
    })
  }

  /** A region of their own for keys, led by the next node that is up; clients learn of it one by one. */
  #open(
    fault: FaultRun,
    old: Region,
    keys: ReadonlySet<Key>,
    { cells, rank }: { cells: readonly Cell[]; rank: number },
    staleRoutes: number,
  ): void {
    const { scheduler, network, random, clients, store } = this.#parts
    const others = Array.from({ length: store.nodes - 1 }, (_, i) => (old.leader + 1 + i) % store.nodes)
    const leader = others.find((node) => !network.stopped[node] && !network.cutOff[node]) ?? old.leader
    const region = new Region(this.#parts, cells, leader, clients, { region: old, rank })
    this.#regions.push(region)
    const until = Array.from(
      { length: clients },
      () => scheduler.now + random.below(1000) * (staleRoutes / 1000),
    )
    for (const key of keys) {
      key.region = region
      key.former = { region: old, fault, until }
    }
    scheduler.after(staleRoutes, () => {
      for (const key of keys) {
        key.former = undefined
        key.isMoving = false
      }
    })
  }

  #markHandover(keys: ReadonlySet<Key>, from: number): void {
    const [first, ...more] = [...keys].map(({ name }) => name)
    const rest = more.length === 0 ? '' : ` and ${more.length} more`
    this.#parts.mark(`handover of ${first}${rest}`, from)
  }

  #promote(run: FaultRun, node: number): void {
    const { scheduler, network, mark } = this.#parts
    for (const region of this.#regions) {
      if (region.leader !== node) continue
      const elect = (): void => {
        // Back before anybody took its place.
        if (!network.stopped[node] && !network.cutOff[node]) return
        if (!region.promote(run)) {
          scheduler.after(AGAIN, elect)
          return
        }
        mark(`${nodeName(region.leader)} leads`, scheduler.now, true)
      }
      elect()
    }
  }

  #catchUp(): void {
    for (const region of this.#regions) region.catchUp()
  }
}
