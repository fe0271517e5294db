/**
 * Messages between clients and nodes: how long they take, and which never arrive.
 */
import type { FaultRun } from './fault-run.js'
import type { Operation } from './operation.js'
import type { Random } from './random.js'
import type { Scheduler } from './scheduler.js'

export interface Delays {
  /** mean time between client and node, and from node to node; nanoseconds */
  readonly network: number
  readonly lag: number
}

export class Network {
  readonly #scheduler: Scheduler
  readonly #random: Random
  readonly #delays: Delays
  /** when the last message on the way from one node to another arrives: they do not overtake one another */
  readonly #arrivals: number[][]
  /** the fault that stopped a node */
  readonly stopped: (FaultRun | undefined)[]
  /** the fault that cut a node off from the other nodes, though not from clients */
  readonly cutOff: (FaultRun | undefined)[]
  /** mean further delay of messages to a node, by fault */
  readonly slow = new Map<FaultRun, { readonly by: number; readonly node: number | undefined }>()
  /** messages between clients and nodes that are lost, by fault */
  readonly losses = new Map<
    FaultRun,
    { readonly share: number; readonly of: 'requests' | 'answers' | 'both' }
  >()

  constructor(scheduler: Scheduler, random: Random, delays: Delays, nodes: number) {
    this.#scheduler = scheduler
    this.#random = random
    this.#delays = delays
    this.#arrivals = Array.from({ length: nodes }, () => new Array<number>(nodes).fill(0))
    this.stopped = new Array(nodes).fill(undefined)
    this.cutOff = new Array(nodes).fill(undefined)
  }

  /** Whether messages pass between two nodes. */
  connects(a: number, b: number): boolean {
    if (a === b) return !this.stopped[a]
    return !(this.stopped[a] || this.stopped[b] || this.cutOff[a] || this.cutOff[b])
  }

  /** From node to node, in order. Lost where they are not connected when it arrives. */
  between(from: number, to: number, deliver: () => void): void {
    let delay = this.#aroundMean(this.#delays.lag)
    for (const { by, node } of this.slow.values())
      if (node === undefined || node === to) delay += this.#aroundMean(by)
    const arrival = Math.max(this.#scheduler.now + delay, this.#arrivals[from][to] + 1)
    this.#arrivals[from][to] = arrival
    this.#scheduler.at(arrival, () => {
      if (this.connects(from, to)) deliver()
    })
  }

  /** A request on its way to a node. */
  toNode(operation: Operation, node: number, deliver: () => void): void {
    this.#carry(operation, node, 'requests', deliver)
  }

  /** An answer on its way to a client. */
  toClient(operation: Operation, node: number, deliver: () => void): void {
    this.#carry(operation, node, 'answers', deliver)
  }

  /** A message to the cache or from it. */
  toCache(deliver: () => void): void {
    this.#scheduler.after(this.#aroundMean(this.#delays.network), deliver)
  }

  #carry(operation: Operation, node: number, what: 'requests' | 'answers', deliver: () => void): void {
    const delay = this.#aroundMean(this.#delays.network)
    for (const [fault, { share, of }] of this.losses) {
      if ((of === 'both' || of === what) && this.#random.chance(share)) {
        operation.hinderedBy ??= fault
        return
      }
    }
    this.#scheduler.after(delay, () => {
      const fault = what === 'requests' ? this.stopped[node] : undefined
      if (fault) operation.hinderedBy ??= fault
      else deliver()
    })
  }

  /** Half of the mean for sure, the rest by chance. */
  #aroundMean(mean: number): number {
    const least = Math.floor(mean / 2)
    return least + this.#random.exponential(mean - least)
  }
}
