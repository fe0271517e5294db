/**
 * A certificate: NDJSON, a header, one claim a line, and a last line that says how many there were. Operations are
 * numbers: 0 is the first operation of the first file, as they stand in the files; a split one counts where it opens.
 */
import { z } from 'zod'
import { SINGLE_KEY_PROMISES } from '../promises/promise.js'
import { CAUSAL_PROMISES } from '../promises/request.js'

const whole = z.int().nonnegative()
const ns = z
  .string()
  .regex(/^[0-9]{1,40}$/)
  .describe('nanoseconds')
const operations = z.array(whole).describe('numbers of operations')

export const headerLineSchema = z.strictObject({
  certificate: z.literal(1).describe('format version'),
  misread: z.string().describe('version that made it'),
  inputs: z
    .array(z.strictObject({ file: z.string(), sha256: z.string().regex(/^[0-9a-f]{64}$/) }))
    .min(1)
    .describe('in the order in which they were read'),
  operations: whole.describe('how many operations the inputs hold'),
  clockErrorNs: ns,
  onlyKeys: z.array(z.string()).exactOptional().describe('globs: keys that match none were not looked at'),
  promises: z
    .array(
      z.strictObject({
        name: z.string(),
        promise: z.enum([...SINGLE_KEY_PROMISES, ...CAUSAL_PROMISES]),
        keys: z.string().describe('glob of the keys that it is claimed for'),
        withinNs: ns.exactOptional(),
        settleNs: ns.exactOptional(),
        versions: whole.exactOptional(),
      }),
    )
    .min(1),
})

const promises = z.array(z.string()).min(1).describe('names of the promises that the line is about')
const key = z.string().exactOptional().describe('missing where the promise is one over all keys')

export const claimLineSchema = z.discriminatedUnion('claim', [
  z.strictObject({
    claim: z.literal('holds'),
    key,
    promises,
    order: operations
      .exactOptional()
      .describe('a sequence that keeps the promise; missing where the definition is checked as it is'),
    leftOut: z
      .array(z.string())
      .exactOptional()
      .describe('keys that the promise over all keys does not cover'),
  }),
  z.strictObject({
    claim: z.literal('broken'),
    key,
    promises,
    counterexample: operations.exactOptional().describe('operations that no sequence explains'),
    bounds: z
      .strictObject({ from: whole.exactOptional().describe('missing: the start'), to: whole })
      .exactOptional()
      .describe('two counts that the increments between them do not allow'),
    leftOut: z.array(z.string()).exactOptional(),
  }),
  z.strictObject({ claim: z.literal('undecided'), key, promises }),
  z.strictObject({ claim: z.literal('left-out'), key: z.string(), promises }),
])

export const endLineSchema = z.strictObject({ end: z.literal(true), claims: whole })

export const certificateLineSchema = z.union([headerLineSchema, claimLineSchema, endLineSchema])

export type HeaderLine = z.infer<typeof headerLineSchema>
export type ClaimLine = z.infer<typeof claimLineSchema>
