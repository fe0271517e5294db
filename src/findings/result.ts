/**
 * The result of a check, version 1: the one definition that the types, the readers of saved results and the
 * published JSON Schema (docs/schema/result.schema.json) are made from. docs/result.md says it in words.
 *
 * What is not known or not made is absent: no field is ever null. Nanosecond counts, counts of a counter and
 * values are text, so that nobody's 64-bit number goes through a double. A later version may add fields.
 */
import { z } from 'zod'
import { FINDING_KINDS } from './kinds.js'

/** A whole number in digits, exact at any size. */
const digits = z.string().regex(/^(0|-?[1-9][0-9]*)$/)
/** How many of something. */
const count = z.int().min(0)
/** A place in a list of the same finding, from 0. */
const index = z.int().min(0)
/** A line of a file, from 1. */
const line = z.int().min(1)

export const verdictSchema = z.enum(['holds', 'broken', 'undecided'])
export const findingKindSchema = z.enum(FINDING_KINDS)

/** Digits: the largest clock error in nanoseconds under which it is still broken. */
const margin = z.union([digits, z.literal('unbounded')])

const inputSchema = z.object({
  file: z.string().describe('the name as given, "-" for standard input'),
  bytes: count.describe('bytes read, before decompression'),
  sha256: z
    .string()
    .regex(/^[0-9a-f]{64}$/)
    .exactOptional()
    .describe('of those bytes; where the result is written to a file'),
})

const historySchema = z.object({
  title: z.string().exactOptional(),
  operations: count,
  reads: count,
  writes: count,
  increments: count,
  cas: count,
  deletes: count,
  acked: count,
  refused: count,
  unsure: count,
  clients: count,
  hosts: count.describe('hosts that the records name'),
  keys: count,
  marks: count,
  firstStart: digits.describe('nanoseconds since the epoch'),
  lastEnd: digits.describe('the latest time of any operation, nanoseconds since the epoch'),
  clockErrorNs: digits.describe('the clock error that was assumed'),
  clockErrorFrom: z
    .enum(['option', 'headers', 'default'])
    .describe('where it came from: given for this check, the largest of the headers, or nobody said (0)'),
})

const promiseResultSchema = z.object({
  name: z.string().describe('as typed, or its name in the promises file'),
  promise: z.string(),
  parameters: z.record(z.string(), z.union([z.string(), z.int()])),
  keys: z.string().describe("the promise's own glob"),
  verdict: verdictSchema,
  holds: count.exactOptional().describe('keys; a promise over several keys has no such counts'),
  broken: count.exactOptional(),
  undecided: count.exactOptional(),
  leftOut: count.describe('keys on which it means nothing'),
  untested: count.exactOptional().describe('of the keys where it holds, those with nothing to test it on'),
})

const keyResultSchema = z.object({
  key: z.string(),
  kind: z.enum(['register', 'counter', 'mixed']),
  operations: count,
  verdicts: z.record(z.string(), verdictSchema).describe("by the promise's name; one left out is absent"),
  untested: z.array(z.string()).exactOptional().describe('names of the promises that hold untested here'),
  marginNs: z.record(z.string(), margin).exactOptional(),
  upholds: z.array(z.string()).exactOptional(),
})

const findingOperationSchema = z.object({
  file: z.string(),
  line,
  closeFile: z.string().exactOptional().describe('only where it is another file than the opening half'),
  closeLine: line.exactOptional().describe('of the closing half of a split record'),
  role: z.string().describe('what it is in the story'),
  client: z.string(),
  host: z.string().exactOptional(),
  key: z.string(),
  op: z.enum(['read', 'write', 'increment', 'cas', 'delete']),
  outcome: z.enum(['acked', 'refused', 'unsure']),
  value: z.string().exactOptional().describe('canonical JSON text, as all values here; "null" is absence'),
  by: z.string().exactOptional(),
  expect: z.string().exactOptional(),
  basis: z.string().exactOptional(),
  applied: z.boolean().exactOptional().describe('of an acked cas'),
  saw: z.string().exactOptional(),
  startNs: digits.describe('nanoseconds since the epoch'),
  endNs: digits.exactOptional().describe('absent where the request never came back'),
  record: z.string().describe("the input's own text"),
  closeRecord: z.string().exactOptional(),
})

const chainStepSchema = z.object({
  type: z
    .enum(['pair', 'initial', 'returned', 'found', 'session', 'conflict', 'overwritten'])
    .describe(
      'pair: a counted pair; initial: the initial value comes first; returned: after read what before wrote; ' +
        'found: a cas directly after what it found; session: the same client before; conflict: a read of after depended on before; overwritten: before returned what after overwrote',
    ),
  before: index.exactOptional().describe('index into operations; absent: the initial value'),
  after: index,
  why: z.string(),
})

const boundsSchema = z.object({
  from: index.exactOptional().describe('the read counted from; absent: the start of the history'),
  fromCount: digits,
  toCount: digits.describe('what the blamed read returned'),
  least: digits.describe('the increments between come to at least this'),
  most: digits.describe('and to at most this'),
})

const findingMarkSchema = z.object({
  mark: z.string(),
  relation: z.enum(['during', 'after']),
  afterNs: digits.exactOptional(),
})

export const findingSchema = z.object({
  id: z.int().min(1),
  kind: findingKindSchema,
  also: z.array(findingKindSchema).min(1).exactOptional().describe('other kinds that fit'),
  promise: z.string().describe("the promise's name"),
  key: z.string().exactOptional(),
  keys: z.array(z.string()).exactOptional().describe('instead of key, where it spans several'),
  summary: z.string(),
  blamed: index.describe('index into operations'),
  cause: index.exactOptional().describe('the overwriting write, where there is one: what others share'),
  operations: z.array(findingOperationSchema).min(1).describe('the evidence in order of time'),
  chain: z.array(chainStepSchema).min(1).exactOptional(),
  bounds: boundsSchema.exactOptional(),
  marginNs: margin.exactOptional(),
  marks: z.array(findingMarkSchema).min(1).exactOptional(),
  counterexample: z.string().exactOptional().describe('its file in the folder that --out writes'),
})

const undecidedSchema = z.object({
  key: z.string().exactOptional().describe('absent where the promise is decided over several keys'),
  promise: z.string(),
  reason: z.string(),
  progress: z.string().exactOptional().describe('how far the search came'),
})

const warningSchema = z.object({
  code: z.string(),
  file: z.string().exactOptional(),
  line: line.exactOptional(),
  text: z.string(),
})

/** A whole result, version 1. */
export const resultSchema = z.object({
  result: z.literal(1),
  misread: z.string().describe('the version that made it'),
  inputs: z.array(inputSchema),
  history: historySchema,
  onlyKeys: z.array(z.string()).min(1).exactOptional().describe('the globs that the check was limited to'),
  promises: z.array(promiseResultSchema),
  keys: z.array(keyResultSchema),
  findings: z.array(findingSchema),
  findingCounts: z.partialRecord(findingKindSchema, count),
  undecided: z.array(undecidedSchema),
  warnings: z.array(warningSchema),
  interrupted: z.literal(true).exactOptional().describe('it was stopped: keys not reached are undecided'),
  exit: z.union([z.literal(0), z.literal(1), z.literal(3), z.literal(130)]),
})

export type HistoryFacts = z.infer<typeof historySchema>
export type PromiseResult = z.infer<typeof promiseResultSchema>
export type KeyResult = z.infer<typeof keyResultSchema>
export type FindingOperation = z.infer<typeof findingOperationSchema>
export type ChainStep = z.infer<typeof chainStepSchema>
export type Bounds = z.infer<typeof boundsSchema>
export type Finding = z.infer<typeof findingSchema>
export type Result = z.infer<typeof resultSchema>
