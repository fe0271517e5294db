/**
 * A range of keys with a log of its own on every node: a leader that takes changes, followers that copy its log.
 *
 * Under quorum replication a change is carried out and answered when a majority has it in its log, and a leader is
 * chosen among a majority, the one with the newest log; what was answered is then in it (the argument of Ongaro and
 * Ousterhout 2014, in which elections and the catching up of nodes take no messages here). Under asynchronous
 * replication the leader answers first.
 */
import type { FaultRun } from './fault-run.js'
import { nodeName } from './names.js'
import type { Network } from './network.js'
import type { Answer, Cell, Key, Operation, Via } from './operation.js'
import type { Referee } from './referee.js'
import { type Entry, Replica } from './replica.js'
import type { Scenario } from './scenario-schema.js'

/** Room for the entries of one epoch. */
const EPOCH = 2 ** 32

type Reply = (answer: Answer) => void

/** Keys on their way to another region, while this one still takes changes of them. */
interface Move {
  readonly keys: ReadonlySet<Key>
  readonly fault: FaultRun
  /** changes that the copy lacks */
  readonly entries: Entry[]
  /** the new owner has taken over */
  isOver: boolean
}

export class Region {
  readonly replicas: readonly Replica[]
  /** the node that the cluster takes for the leader */
  leader: number
  /** by client: the node that it takes for the leader */
  readonly believed: number[]
  /** keys whose changes, or whose requests, are turned away */
  readonly frozen = new Set<Key>()
  readonly closed = new Set<Key>()
  readonly #store: Scenario['store']
  readonly #network: Network
  readonly #referee: Referee
  /** where the keys were before, and the newest entry that came along */
  readonly #origin: { readonly region: Region; readonly rank: number } | undefined
  readonly #majority: number
  readonly #everybody: number
  /** entries that some node has not, oldest first */
  #recent: Entry[] = []
  readonly #moves: Move[] = []

  constructor(
    parts: { readonly store: Scenario['store']; readonly network: Network; readonly referee: Referee },
    cells: readonly Cell[],
    leader: number,
    clients: number,
    origin?: { readonly region: Region; readonly rank: number },
  ) {
    const { nodes } = parts.store
    this.#store = parts.store
    this.#network = parts.network
    this.#referee = parts.referee
    this.#origin = origin
    this.#majority = Math.floor(nodes / 2) + 1
    this.#everybody = 2 ** nodes - 1
    // Far above the epochs that the other region may still come to.
    const epoch = origin ? origin.region.#newestEpoch() + 1000 : 1
    this.replicas = Array.from({ length: nodes }, () => {
      const replica = new Replica(cells.slice())
      replica.epoch = epoch
      replica.last = epoch * EPOCH
      replica.done = replica.last
      return replica
    })
    this.leader = leader
    this.replicas[leader].leads = true
    this.believed = new Array<number>(clients).fill(leader)
  }

  /** A request that reached a node. */
  receive(node: number, operation: Operation, reply: Reply): void {
    const { key, kind } = operation
    const replica = this.replicas[node]
    const { reads, replication } = this.#store
    if (this.closed.has(key)) reply(refused(node))
    else if (kind === 'read' && reads === 'followers') reply(this.#read(node, key))
    else if (!replica.leads || (kind !== 'read' && this.frozen.has(key))) reply(refused(node))
    else if (kind !== 'read') this.#append(node, operation, reply)
    else if (replication === 'quorum' && reads === 'leader') this.#confirm(node, key, reply)
    else reply(this.#read(node, key))
  }

  /** Whether nodes enough for a leader are connected, the leader among them. */
  isSound(): boolean {
    const least = this.#store.replication === 'quorum' ? this.#majority : 1
    return this.#reachable().includes(this.leader) && this.#reachable().length >= least
  }

  /** Whether changes of these keys are still on their way into the log. */
  isBusyWith(keys: ReadonlySet<Key>): boolean {
    return this.replicas[this.leader].waiting.some(({ key }) => keys.has(key))
  }

  /**
   * Makes another node the leader: of those connected the one with the newest log. False where too few are. `fault`
   * is what took the old one away.
   */
  promote(fault: FaultRun): boolean {
    const reachable = this.#reachable()
    const least = this.#store.replication === 'quorum' ? this.#majority : 1
    if (reachable.length < least) return false
    const chosen = reachable.reduce((a, b) => (this.replicas[b].last > this.replicas[a].last ? b : a))
    const replica = this.replicas[chosen]
    const epoch = this.#newestEpoch() + 1
    if (chosen !== this.leader) this.replicas[this.leader].deposedBy = fault
    for (const entry of this.#recent) if (!holds(entry, chosen)) this.#doom(entry, fault)
    this.leader = chosen
    replica.epoch = epoch
    replica.leads = true
    replica.deposedBy = undefined
    for (const entry of replica.waiting.splice(0)) this.#carryOut(entry, chosen)
    this.catchUp()
    return true
  }

  /** Brings every node that the leader is connected with to the leader's state. */
  catchUp(): void {
    if (!this.#reachable().includes(this.leader)) return
    const leader = this.replicas[this.leader]
    for (const node of this.#reachable()) {
      if (node === this.leader) continue
      this.replicas[node].copy(leader)
      const bit = 2 ** node
      for (const entry of this.#recent) {
        if (holds(entry, this.leader) !== holds(entry, node)) entry.holders += holds(entry, node) ? -bit : bit
      }
    }
    const gone = this.#recent.filter(({ holders }) => holders === 0)
    this.#recent = this.#recent.filter(({ holders }) => holders !== 0 && holders !== this.#everybody)
    for (const entry of gone) this.#discard(entry)
    this.#commit(this.leader)
  }

  /** A copy of the leader's state, for another region; with the rank of the newest change in it. */
  snapshot(): { cells: Cell[]; rank: number } {
    const { cells, done } = this.replicas[this.leader]
    return { cells: cells.slice(), rank: done }
  }

  /** From now on changes of these keys are made here and lost, for a copy of them was taken. */
  startMove(keys: ReadonlySet<Key>, fault: FaultRun): Move {
    const { waiting } = this.replicas[this.leader]
    const move = { keys, fault, entries: waiting.filter(({ key }) => keys.has(key)), isOver: false }
    this.#moves.push(move)
    return move
  }

  /** The new owner has taken over: what came since the copy is not there. */
  takenOver(move: Move): void {
    move.isOver = true
    for (const entry of move.entries) this.#doom(entry, move.fault)
  }

  /** Nobody asks here for the keys any more. */
  endMove(move: Move): void {
    for (const key of move.keys) this.closed.add(key)
    for (const entry of move.entries) this.#discard(entry)
    this.#moves.splice(this.#moves.indexOf(move), 1)
  }

  #reachable(): number[] {
    const { stopped, cutOff } = this.#network
    return this.replicas.map((_, node) => node).filter((node) => !stopped[node] && !cutOff[node])
  }

  #newestEpoch(): number {
    return this.replicas.reduce((newest, { epoch }) => Math.max(newest, epoch), 0)
  }

  #append(node: number, operation: Operation, reply: Reply): void {
    const replica = this.replicas[node]
    if (this.#store.deduplicates) {
      const earlier = operation.entries.find((entry) => this.#includes(entry, node))
      if (earlier?.result) {
        reply(this.#done(earlier, node))
        return
      }
      if (earlier) {
        earlier.waiting.push({ node, reply })
        return
      }
    }
    const own = Math.floor(replica.last / EPOCH) === replica.epoch
    const entry: Entry = {
      rank: own ? replica.last + 1 : replica.epoch * EPOCH + 1,
      previous: replica.last,
      region: this,
      operation,
      key: operation.key,
      holders: 2 ** node,
      result: undefined,
      doomedBy: undefined,
      isDiscarded: false,
      waiting: [{ node, reply }],
    }
    operation.entries.push(entry)
    this.#recent.push(entry)
    replica.last = entry.rank
    if (replica.deposedBy) this.#doom(entry, replica.deposedBy)
    for (const move of this.#moves) {
      if (!move.keys.has(operation.key)) continue
      move.entries.push(entry)
      if (move.isOver) this.#doom(entry, move.fault)
    }
    if (this.#store.replication === 'async') this.#carryOut(entry, node)
    else replica.waiting.push(entry)
    for (let other = 0; other < this.replicas.length; other++)
      if (other !== node) this.#network.between(node, other, () => this.#arrive(entry, node, other))
    if (this.#store.replication === 'quorum') this.#commit(node)
  }

  /** An entry reached a follower: taken where it continues the follower's log. */
  #arrive(entry: Entry, from: number, to: number): void {
    const replica = this.replicas[to]
    if (replica.epoch !== Math.floor(entry.rank / EPOCH) || replica.last !== entry.previous) return
    replica.last = entry.rank
    entry.holders += 2 ** to
    if (this.#store.replication === 'async') replica.apply(entry)
    else {
      replica.waiting.push(entry)
      this.#network.between(to, from, () => this.#commit(from))
    }
    while (this.#recent.length > 0 && this.#recent[0].holders === this.#everybody) this.#recent.shift()
  }

  /** The leader carries out what a majority has, and tells the others. */
  #commit(node: number): void {
    const replica = this.replicas[node]
    if (!replica.leads) return
    let done = 0
    while (replica.waiting.length > 0 && bits(replica.waiting[0].holders) >= this.#majority) {
      const entry = replica.waiting.shift()!
      this.#carryOut(entry, node)
      done = entry.rank
    }
    if (done === 0) return
    const { epoch } = replica
    for (let other = 0; other < this.replicas.length; other++) {
      if (other === node) continue
      this.#network.between(node, other, () => {
        const follower = this.replicas[other]
        if (follower.epoch !== epoch || follower.leads) return
        while (follower.waiting.length > 0 && follower.waiting[0].rank <= done)
          follower.apply(follower.waiting.shift()!)
      })
    }
  }

  #carryOut(entry: Entry, node: number): void {
    const result = this.replicas[node].apply(entry)
    if (!entry.result) {
      entry.result = result
      this.#referee.carriedOut(entry.operation)
      if (entry.doomedBy) this.#referee.doomed(entry.operation, entry.doomedBy)
      if (entry.isDiscarded) this.#referee.lost(entry.operation, entry.doomedBy!)
    }
    for (const { node: asked, reply } of entry.waiting) if (asked === node) reply(this.#done(entry, node))
    entry.waiting.length = 0
  }

  /** Answers a read once a majority has confirmed that it knows no newer leader. */
  #confirm(node: number, key: Key, reply: Reply): void {
    const { epoch } = this.replicas[node]
    let confirmed = 0
    const confirm = (): void => {
      if (++confirmed === this.#majority) reply(this.#read(node, key))
    }
    confirm()
    for (let other = 0; other < this.replicas.length; other++) {
      if (other === node) continue
      this.#network.between(node, other, () => {
        if (this.replicas[other].epoch <= epoch) this.#network.between(other, node, confirm)
      })
    }
  }

  /** Whether an entry is in a node's log, or came along with the keys. */
  #includes(entry: Entry, node: number): boolean {
    if (entry.region === this) return holds(entry, node) && !entry.isDiscarded
    return entry.region === this.#origin?.region && entry.rank <= this.#origin.rank
  }

  #doom(entry: Entry, fault: FaultRun): void {
    entry.doomedBy ??= fault
    entry.operation.lostBy ??= fault
    entry.operation.hinderedBy ??= fault
    if (entry.result) this.#referee.doomed(entry.operation, fault)
  }

  #discard(entry: Entry): void {
    if (entry.isDiscarded) return
    entry.isDiscarded = true
    if (entry.result) this.#referee.lost(entry.operation, entry.doomedBy!)
  }

  #read(node: number, key: Key): Answer {
    const cell = this.replicas[node].cells[key.index]
    return { type: 'done', node: nodeName(node), via: this.#via(node, key), cell, found: cell, applied: true }
  }

  #done({ result, key }: Entry, node: number): Answer {
    return { type: 'done', node: nodeName(node), via: this.#via(node, key), ...result! }
  }

  #via(node: number, key: Key): Via {
    if (key.former?.region === this && key.region !== this)
      return { role: 'former-owner', fault: key.former.fault }
    return this.replicas[node].via()
  }
}

function refused(node: number): Answer {
  return { type: 'refused', node: nodeName(node) }
}

function holds({ holders }: Entry, node: number): boolean {
  return (holders & (2 ** node)) !== 0
}

function bits(mask: number): number {
  let count = 0
  for (let rest = mask; rest !== 0; rest &= rest - 1) count++
  return count
}
