/**
 * The truth beside a rehearsed history, version 1: the one definition that the types and the published JSON Schema are
 * made from. One record a line: a header, a line for each host, one for each thing that befell an operation, a summary.
 */
import { z } from 'zod'

const count = z.int().min(0)

/** What befell an operation. */
const effectSchema = z
  .enum(['lost', 'repeated', 'stale', 'short', 'over', 'contradiction', 'unsure', 'late'])
  .describe(
    'lost: its change was thrown away; repeated: carried out again; stale: its answer lacks what some client had been told ' +
      'before it began; short, over: a count below what was acknowledged before, above all that had been asked for; ' +
      'contradiction: right by itself, but the answers so far cannot all be right; unsure: its client gave up; ' +
      'late: carried out after that',
  )

const headerSchema = z.strictObject({ truth: z.literal(1), title: z.string(), seed: count })

const hostSchema = z.strictObject({
  host: z.string(),
  offNs: z.int().describe('its clock less true time, at the start'),
  driftNsPerSecond: z.int(),
  isWithinStated: z.boolean().describe('whether it stays within the header’s clockError while clients write'),
})

const hitSchema = z.strictObject({
  line: z.int().min(1).describe('of the history'),
  client: z.string(),
  op: z.enum(['read', 'write', 'increment', 'cas', 'delete']),
  key: z.string(),
  effect: effectSchema,
  cause: z.string().describe('a fault of the scenario, or the way of the store that did it'),
  fault: z.int().min(1).exactOptional().describe('its place in the scenario’s list of faults'),
  times: z.int().min(2).exactOptional().describe('repeated: how many times it has been carried out by then'),
  provable: z
    .boolean()
    .exactOptional()
    .describe('answers: whether those so far, under true clocks, contradict each other from here on'),
  carriedOut: z
    .boolean()
    .exactOptional()
    .describe('unsure changes: whether the store had carried it out by then'),
  at: z
    .string()
    .regex(/^[0-9]+$/)
    .describe('true time, ns since the epoch'),
})

const summarySchema = z.strictObject({
  summary: z.strictObject({
    operations: count,
    outcomes: z.strictObject({ acked: count, refused: count, unsure: count }),
    hits: z.array(z.strictObject({ effect: effectSchema, cause: z.string(), count })),
  }),
})

/** Any line of the truth. */
export const truthSchema = z.union([headerSchema, hostSchema, hitSchema, summarySchema])

export type HitEffect = z.infer<typeof effectSchema>
export type TruthHit = z.infer<typeof hitSchema>
/** What a rehearsal came to. */
export type Account = z.infer<typeof summarySchema>['summary']
