/**
 * A store without leaders: a client writes to some nodes and reads from some, drawn by chance, and takes the newest
 * value that it finds. Nothing repairs a node that missed a write.
 */
import { nodeName } from './names.js'
import type { Network } from './network.js'
import type { Answer, Cell, Operation } from './operation.js'
import type { Random } from './random.js'
import type { Referee } from './referee.js'
import { change } from './replica.js'
import type { Scenario } from './scenario-schema.js'
import type { Store } from './store.js'

export class QuorumStore implements Store {
  readonly #network: Network
  readonly #random: Random
  readonly #referee: Referee
  /** by node, then by the index of the key */
  readonly #cells: Cell[][]
  readonly #writeQuorum: number
  readonly #readQuorum: number
  readonly #spreads: boolean
  readonly #deduplicates: boolean
  /** of writes that may be sent again: then they keep their rank */
  readonly #given = new WeakMap<Operation, number>()
  #ranks = 0

  constructor(
    { network, random, referee }: { network: Network; random: Random; referee: Referee },
    { nodes, writeQuorum, readQuorum, spreads, deduplicates }: Scenario['store'],
    cells: readonly Cell[],
  ) {
    const majority = Math.floor(nodes / 2) + 1
    this.#network = network
    this.#random = random
    this.#referee = referee
    this.#cells = Array.from({ length: nodes }, () => cells.slice())
    this.#writeQuorum = writeQuorum ?? majority
    this.#readQuorum = readQuorum ?? majority
    this.#spreads = spreads
    this.#deduplicates = deduplicates
  }

  send(operation: Operation, reply: (answer: Answer) => void): void {
    if (operation.kind === 'read') this.#read(operation, reply)
    else this.#write(operation, reply)
  }

  gaveUp(): void {}

  /** Versions are ordered by when their writes began: a perfect clock gives them their ranks. */
  #write(operation: Operation, reply: (answer: Answer) => void): void {
    const { index } = operation.key
    const rank = (this.#deduplicates ? this.#given.get(operation) : undefined) ?? ++this.#ranks
    this.#given.set(operation, rank)
    let isCarriedOut = false
    const nodes = this.#random.choose(this.#writeQuorum, this.#cells.length)
    if (this.#spreads)
      for (let node = 0; node < this.#cells.length; node++) if (!nodes.includes(node)) nodes.push(node)
    let stored = 0
    for (const node of nodes) {
      this.#network.toNode(operation, node, () => {
        const found = this.#cells[node][index]
        const cell = change(found, rank, operation)!
        if (rank > found.rank) this.#cells[node][index] = cell
        isCarriedOut ||= this.#deduplicates && operation.timesDone > 0
        if (!isCarriedOut) this.#referee.carriedOut(operation)
        isCarriedOut = true
        const answer: Answer = {
          type: 'done',
          node: nodeName(node),
          via: { role: 'quorum' },
          cell,
          found,
          applied: true,
        }
        this.#network.toClient(operation, node, () => {
          if (++stored === this.#writeQuorum) reply(answer)
        })
      })
    }
  }

  #read(operation: Operation, reply: (answer: Answer) => void): void {
    const { index } = operation.key
    let newest: Cell | undefined
    let answered = 0
    const names: string[] = []
    for (const node of this.#random.choose(this.#readQuorum, this.#cells.length)) {
      this.#network.toNode(operation, node, () => {
        const cell = this.#cells[node][index]
        const answer: Answer = {
          type: 'done',
          node: nodeName(node),
          via: { role: 'quorum' },
          cell,
          found: cell,
          applied: true,
        }
        this.#network.toClient(operation, node, () => {
          names.push(nodeName(node))
          if (!newest || cell.rank > newest.rank) newest = cell
          if (++answered < this.#readQuorum) return
          reply({ ...answer, node: names.sort().join(' '), cell: newest, found: newest })
        })
      })
    }
  }
}
