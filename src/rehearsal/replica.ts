/**
 * One node's copy of a region: its log, and the state that the log comes to.
 */

import type { FaultRun } from './fault-run.js'
import type { Answer, Cell, Found, Key, Operation, Via } from './operation.js'
import type { Region } from './region.js'

/** A change in the log of a region. */
export interface Entry {
  /** epoch · 2^32 + index: higher is newer */
  readonly rank: number
  /** rank of the entry before it in its log */
  readonly previous: number
  readonly region: Region
  readonly operation: Operation
  readonly key: Key
  /** bit i: node i has it in its log */
  holders: number
  /** once carried out by a leader */
  result: Result | undefined
  /** set where its effect is thrown away, even if it comes later */
  doomedBy: FaultRun | undefined
  isDiscarded: boolean
  /** who waits for it to be carried out */
  readonly waiting: { readonly node: number; readonly reply: (answer: Answer) => void }[]
}

export interface Result {
  readonly found: Found
  readonly cell: Cell
  readonly applied: boolean
}

export class Replica {
  /** by the index of the key */
  cells: Cell[]
  /** in the log and not yet carried out, oldest first */
  waiting: Entry[] = []
  /** rank of the newest entry of the log, and of the newest one carried out */
  last = 0
  done = 0
  epoch = 1
  /** whether it takes itself for the leader */
  leads = false
  /** what deposed it, while it does not know */
  deposedBy: FaultRun | undefined

  constructor(cells: Cell[]) {
    this.cells = cells
  }

  /** Carries an entry out. */
  apply({ rank, key, operation }: Pick<Entry, 'rank' | 'key' | 'operation'>): Result {
    const found = this.cells[key.index]
    const cell = change(found, rank, operation)
    this.cells[key.index] = cell ?? found
    this.done = rank
    const { version, count } = found
    return {
      found: { rank: found.rank, version, count },
      cell: cell ?? found,
      applied: cell !== undefined,
    }
  }

  /** Takes the log and state of another over. */
  copy(other: Replica): void {
    this.cells = other.cells.slice()
    this.waiting = other.waiting.slice()
    this.last = other.last
    this.done = other.done
    this.epoch = other.epoch
    this.leads = false
    this.deposedBy = undefined
  }

  via(): Via {
    if (this.deposedBy) return { role: 'deposed-leader', fault: this.deposedBy }
    return { role: this.leads ? 'leader' : 'follower' }
  }
}

/** What a change makes of the state; undefined where a comparison fails. */
export function change(found: Cell, rank: number, operation: Operation): Cell | undefined {
  switch (operation.kind) {
    case 'increment':
      return { rank, by: operation, version: found.version, count: found.count + operation.by }
    case 'cas':
      if (found.version.text !== operation.expect) return undefined
      break
    default:
  }
  return { rank, by: operation, version: operation.version!, count: found.count }
}
