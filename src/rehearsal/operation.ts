/**
 * What the simulation knows of keys, values and requests: more than any client could record.
 */
import type { FaultRun } from './fault-run.js'
import type { KeyKind } from './names.js'
import type { Region } from './region.js'
import type { Entry } from './replica.js'

/** A key, and what clients have been told of it so far. */
export interface Key {
  readonly index: number
  readonly name: string
  readonly kind: KeyKind
  readonly isCached: boolean
  /** Where its requests go; undefined without leaders. */
  region: Region | undefined
  /** on its way to another owner, or its clients are */
  isMoving: boolean
  /** after a handover: the earlier owner, and until when a client may ask it */
  former: { readonly region: Region; readonly fault: FaultRun; readonly until: readonly number[] } | undefined
  /** the newest effect that some client was told of, by an acknowledgement or an answer */
  known: Effect
}

/** The state of one key on one node. Replaced, never changed. */
export interface Cell {
  /** place in the store's order of changes: a higher rank is newer */
  readonly rank: number
  /** who made the last change; undefined: nobody */
  readonly by: Operation | undefined
  /** what a register holds */
  readonly version: Version
  /** what a counter holds */
  readonly count: number
}

export type Effect = Pick<Cell, 'rank' | 'by'>

/** What a change found, without who had made it: a chain of those would keep all of the past in memory. */
export type Found = Omit<Cell, 'by'>

/** One writing of a register, whatever the value. */
export interface Version {
  /** the value as JSON; `null` is absence */
  readonly text: string
  /** when the first request that wrote or returned it had ended; infinite before that. Nanoseconds, true time. */
  firstEnd: number
  /** when the last one that ended so far had begun */
  lastStart: number
}

export type OperationKind = 'read' | 'write' | 'increment' | 'cas' | 'delete'

export function newVersion(text: string): Version {
  return { text, firstEnd: Number.POSITIVE_INFINITY, lastStart: Number.NEGATIVE_INFINITY }
}

/** One request of a client, from its start to the last thing that the truth says of it. */
export class Operation {
  readonly client: number
  readonly kind: OperationKind
  readonly key: Key
  /** write, cas, delete: what it writes */
  readonly version: Version | undefined
  /** cas: the value that must be there, as JSON */
  readonly expect: string | undefined
  readonly by: number
  /** true time */
  readonly start: number
  /** what clients had been told of the key when it began; forgotten once it has ended */
  knownAtStart: Effect
  /** until an answer came or the client gave up */
  isOpen = true
  /** how many times the store carried it out */
  timesDone = 0
  /** its places in the logs of regions */
  readonly entries: Entry[] = []
  /** the fault that threw its effect away, or put it where it will be */
  lostBy: FaultRun | undefined
  /** the first fault that kept a message of it from arriving */
  hinderedBy: FaultRun | undefined
  /** its line in the history, from 1; 0: not written yet */
  line = 0
  /** lines of the truth that wait for that */
  readonly pending: ((line: number) => string)[] = []

  constructor(
    client: number,
    start: number,
    request: {
      readonly kind: OperationKind
      readonly key: Key
      readonly version?: Version
      readonly expect?: string
      readonly by?: number
    },
  ) {
    this.client = client
    this.start = start
    this.kind = request.kind
    this.key = request.key
    this.version = request.version
    this.expect = request.expect
    this.by = request.by ?? 1
    this.knownAtStart = request.key.known
  }

  /** Forgets what is needed only until it ends, lest every operation keep the one before it in memory. */
  close(): void {
    this.isOpen = false
    this.knownAtStart = { rank: 0, by: undefined }
  }
}

/** Which part of the store answered. */
export interface Via {
  readonly role: 'leader' | 'follower' | 'deposed-leader' | 'former-owner' | 'cache' | 'quorum'
  readonly fault?: FaultRun
}

/** What comes back from the store. */
export type Answer =
  | {
      readonly type: 'done'
      readonly node: string
      readonly via: Via
      /** what a read found; what a change left behind */
      readonly cell: Cell
      /** what a change found */
      readonly found: Found
      /** cas: whether the value was the expected one */
      readonly applied: boolean
    }
  | { readonly type: 'refused'; readonly node: string }
