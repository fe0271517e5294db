/**
 * A scenario of `misread rehearse`, version 1: the one definition that the types, the reader of scenario files and
 * the published JSON Schema are made from. docs/rehearsal.md says it in words.
 */
import { z } from 'zod'
import { parseDuration } from '../promises/duration.js'

/** Nothing in a rehearsal lasts longer: times then stay whole in a double. */
const LONGEST_NS = 7n * 24n * 3600n * 1_000_000_000n

const DURATION = 'a duration of up to 168h, such as 2ms, 150us or 1.5s'
/** A duration as people write it; in the scenario it is a number of nanoseconds. */
const duration = z.string({ error: DURATION }).transform((text, context) => {
  const ns = parseDuration(text)
  if (ns !== undefined && ns <= LONGEST_NS) return Number(ns)
  context.addIssue({ code: 'custom', message: DURATION })
  return z.NEVER
})
/** A share of 1. */
const share = z.number().min(0).max(1)
const count = (least: number, most: number) => z.int().min(least).max(most)

const cacheSchema = z.strictObject({
  keys: z.string().default('**').describe('glob of the keys that clients read through the cache'),
  keeps: duration.default(200_000_000).describe('how long the cache keeps a value'),
  invalidates: z.boolean().default(true).describe('whether a writer drops the value once it has written'),
})

const storeSchema = z.strictObject({
  nodes: count(1, 30).default(3),
  replication: z
    .enum(['quorum', 'async', 'leaderless'])
    .default('quorum')
    .describe(
      'quorum: the leader answers when a majority has the write; async: at once; ' +
        'leaderless: clients write to and read from random quorums',
    ),
  reads: z
    .enum(['leader', 'unconfirmed-leader', 'followers'])
    .default('leader')
    .describe(
      'leader: under quorum it first makes sure that it still leads; unconfirmed-leader: it does not; followers: any node',
    ),
  writeQuorum: count(1, 30)
    .exactOptional()
    .describe('leaderless: nodes that a write waits for; default a majority'),
  readQuorum: count(1, 30).exactOptional().describe('leaderless: nodes that a read asks; default a majority'),
  spreads: z.boolean().default(true).describe('leaderless: whether a write goes to the other nodes as well'),
  deduplicates: z
    .boolean()
    .default(true)
    .describe('whether a request that is sent again is carried out once'),
  network: duration.default(500_000).describe('mean time of a message between client and node'),
  lag: duration.default(1_000_000).describe('mean time of a message from node to node'),
  cache: cacheSchema.exactOptional().describe('a look-aside cache before the store'),
})

const retriesSchema = z.strictObject({
  times: count(1, 10).default(2),
  after: duration.default(30_000_000).describe('without an answer'),
  of: z
    .array(z.enum(['read', 'write', 'increment', 'cas', 'delete']))
    .min(1)
    .default(['increment']),
})

const workloadSchema = z.strictObject({
  lasts: duration.default(3_000_000_000).describe('before the closing reads'),
  clients: count(1, 10_000).default(8),
  hosts: count(1, 10_000).default(4).describe('clients share them, and with them a clock'),
  pause: duration.default(10_000_000).describe('mean time between a client’s requests'),
  timeout: duration.default(100_000_000).describe('when a client gives up: its request is then unsure'),
  retries: retriesSchema.exactOptional().describe('what the client library sends again by itself'),
  berths: count(0, 1_000_000).default(8).describe('keys that are read and written'),
  sailings: count(0, 1_000_000).default(2).describe('counters'),
  leases: count(0, 1_000_000).default(0).describe('keys taken by compare-and-set'),
  reads: share.default(0.5).describe('share of the requests'),
  deletes: share.default(0).describe('share of the writes'),
  readBack: share.default(0.25).describe('share of the changes that their client reads at once'),
  returnsCount: z.boolean().default(false).describe('whether an increment answers the count'),
  vessels: count(1, 1_000_000)
    .exactOptional()
    .describe('so many different values, written again and again; default: no value twice'),
  settle: duration.default(1_000_000_000).describe('rest before the closing reads'),
  closingReads: count(0, 100).default(2).describe('of every key, each by another client'),
})

const clocksSchema = z.strictObject({
  stated: duration.default(0).describe('the clockError of the header'),
  off: duration.default(0).describe('hosts’ clocks start up to so far from true time, before or behind'),
  drift: duration.default(0).describe('and go wrong by up to so much each second'),
})

/** When a fault begins; again and again with `every`. */
const when = { at: duration, every: duration.exactOptional() }

const faultSchema = z.discriminatedUnion('fault', [
  z.strictObject({
    fault: z.literal('failover'),
    ...when,
    detect: duration.default(150_000_000).describe('until another node leads'),
    lasts: duration.default(600_000_000).describe('until the stopped leader is back, as a follower'),
  }),
  z.strictObject({
    fault: z.literal('two-leaders'),
    ...when,
    detect: duration.default(100_000_000).describe('until the others have a leader of their own'),
    lasts: duration.default(600_000_000).describe('until the old leader is reached again, and steps down'),
    stay: share.default(0.5).describe('share of the clients that stay with the old leader'),
  }),
  z.strictObject({
    fault: z.literal('handover'),
    ...when,
    keys: z.string().describe('glob of the keys that are handed to another node'),
    copying: duration
      .default(100_000_000)
      .describe('from the copy to the moment that the new owner takes over'),
    staleRoutes: duration.default(100_000_000).describe('how long clients may still ask the old owner'),
    sound: z.boolean().default(false).describe('whether the old owner turns requests away from the copy on'),
  }),
  z.strictObject({
    fault: z.literal('lost-messages'),
    ...when,
    lasts: duration,
    share: share.default(0.05),
    of: z.enum(['requests', 'answers', 'both']).default('both'),
  }),
  z.strictObject({
    fault: z.literal('slow-replication'),
    ...when,
    lasts: duration,
    by: duration.default(200_000_000).describe('mean further time of a message to the node'),
    node: count(1, 30).exactOptional().describe('default: every node'),
  }),
  z.strictObject({
    fault: z.literal('node-stopped'),
    ...when,
    lasts: duration,
    node: count(1, 30),
  }),
  z.strictObject({
    fault: z.literal('lost-invalidations'),
    ...when,
    lasts: duration,
    share: share.default(0.5),
  }),
])

export const scenarioSchema = z.strictObject({
  rehearsal: z.literal(1).describe('format version'),
  title: z.string().default('rehearsal'),
  store: storeSchema.prefault({}),
  workload: workloadSchema.prefault({}),
  clocks: clocksSchema.prefault({}),
  faults: z.array(faultSchema).default([]),
})

/** A scenario with every default in its place; durations in nanoseconds. */
export type Scenario = z.output<typeof scenarioSchema>
/** A scenario as people write it. */
export type ScenarioText = z.input<typeof scenarioSchema>
export type FaultSpec = Scenario['faults'][number]
