/**
 * A history in memory: one entry an operation in flat typed columns, in input order.
 *
 * Operation index `i` runs over acked, refused and unsure operations alike, in the order of their (opening)
 * lines: files as given, then lines. Everything below is indexed by it unless it says otherwise. Ids
 * (`client`, `host`, `key`, value ids) are dense indices into the name tables, given in order of first
 * appearance. The original line is fetched again only for what is shown (`lines.ts`).
 */
import type { Times } from './times.js'

/** Kinds of operation, as stored in `History.kind`. */
export const READ = 0
export const WRITE = 1
export const INCREMENT = 2
export const CAS = 3
export const DELETE = 4
export const KIND_NAMES = ['read', 'write', 'increment', 'cas', 'delete'] as const

/** Outcomes, as stored in `History.outcome`. */
export const ACKED = 0
export const REFUSED = 1
export const UNSURE = 2
export const OUTCOME_NAMES = ['acked', 'refused', 'unsure'] as const

/** In a value column: the record carries no such value. */
export const NO_VALUE = -1
/** The value id of `null`, absence. Every history has it. */
export const NULL_VALUE = 0

/** A table of distinct names; ids are dense, in order of first appearance. */
export interface Names {
  readonly size: number
  /** The name with this id. */
  name(id: number): string
  /** The id of this name, or -1. */
  find(name: string): number
}

/** A table of distinct JSON values under the format's equality; id 0 is `null`. */
export interface Values {
  readonly size: number
  /**
   * The value as canonical JSON text: no white space, object members sorted, numbers in one spelling each of
   * their exact decimal value. Two values are equal exactly when these texts are.
   */
  text(id: number): string
  /** The whole number that the value is, exactly, or undefined when it is anything else. */
  integer(id: number): bigint | undefined
  /** The id of the value with this canonical text, or -1. */
  find(text: string): number
}

/** Something that happened to the store. Times in nanoseconds; `end` equals `start` for an instant. */
export interface Mark {
  readonly text: string
  readonly startNs: bigint
  readonly endNs: bigint
  /** index into `History.files` */
  readonly file: number
  /** 1-based */
  readonly line: number
}

/** One input, as it was read. */
export interface InputFile {
  /** the name as given, `-` for standard input */
  readonly name: string
  /** bytes read from it, before decompression */
  readonly bytes: number
  /** nanoseconds in one unit of this file's times */
  readonly unitNs: bigint
  /** index of the file's first operation in the columns (its operations are contiguous) */
  readonly firstOperation: number
  /** a dump of the store: its lines are keys and values, not records */
  readonly isDump?: true
}

/** A state of affairs worth a warning that is not an error. */
export interface Warning {
  /** stable, kebab-case */
  readonly code: string
  readonly file?: string
  /** 1-based */
  readonly line?: number
  readonly text: string
}

export interface History {
  /** number of operations; every column has at least this many entries */
  readonly count: number
  readonly client: Int32Array
  /** host id >= 0, or -1 - client for the client's own clock; equal numbers mean one clock */
  readonly host: Int32Array
  readonly key: Int32Array
  /** READ … DELETE */
  readonly kind: Uint8Array
  /** ACKED, REFUSED or UNSURE; an open that was never closed is UNSURE */
  readonly outcome: Uint8Array
  /** cas: 1 it took effect, 0 the comparison failed; 1 on every other kind */
  readonly applied: Uint8Array
  /**
   * value id. read: what came back; write, cas: the new value; delete: NULL_VALUE; increment: the count after
   * it, or NO_VALUE. NO_VALUE on reads that were refused or unsure and on unsure increments.
   */
  readonly value: Int32Array
  /** value id. increment: its `by`; cas: `expect`; write: `basis` or NO_VALUE; else NO_VALUE */
  readonly extra: Int32Array
  /** value id of a failed cas's `saw` or NO_VALUE; undefined when no record has one */
  readonly saw: Int32Array | undefined
  /** start and end of every operation, exact; an end that never came is `hasEnd` 0 */
  readonly times: Times
  /** 0 where the request never came back */
  readonly hasEnd: Uint8Array
  /** 1-based line of the (opening) record in its file */
  readonly line: Uint32Array
  /** 1-based line of the closing half, 0 where there is none; undefined when no record is split */
  readonly closeLine: Uint32Array | undefined
  /** file index of the closing half; undefined when every close stands in its open's file */
  readonly closeFile: Int32Array | undefined

  readonly clients: Names
  /** named hosts */
  readonly hosts: Names
  readonly keys: Names
  readonly values: Values
  readonly files: readonly InputFile[]
  readonly marks: readonly Mark[]
  readonly warnings: readonly Warning[]
  readonly title: string | undefined
  /** the largest clock error that a header states, in nanoseconds */
  readonly clockErrorNs: bigint
  /** key id or, for keys that no operation uses, nothing: initial value ids from the headers */
  readonly initial: ReadonlyMap<number, number>
  readonly initialUnknown: boolean
}

/** Index of the file that operation `i` stands in. */
export function fileOf(history: Pick<History, 'files'>, i: number): number {
  const { files } = history
  let low = 0
  let high = files.length - 1
  while (low < high) {
    const middle = (low + high + 1) >> 1
    if (files[middle].firstOperation <= i) low = middle
    else high = middle - 1
  }
  return low
}
