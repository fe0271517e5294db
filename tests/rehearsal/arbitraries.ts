/** Random parts of scenarios: short ones, with faults that overlap in every way. */
import fc from 'fast-check'

export const duration = (from: number, to: number): fc.Arbitrary<string> =>
  fc.integer({ min: from, max: to }).map((ms) => `${ms}ms`)

const at = duration(0, 900)
const lasts = duration(1, 500)

/** What a quorum store survives. */
export const survivedFault = fc.oneof(
  fc.record({
    fault: fc.constantFrom('failover' as const, 'two-leaders' as const),
    at,
    detect: duration(1, 150),
    lasts: duration(151, 500),
  }),
  fc.record({
    fault: fc.constant('handover' as const),
    at,
    keys: fc.constantFrom('**', 'berth/*', 'berth/1'),
    copying: duration(0, 200),
    staleRoutes: duration(0, 200),
    sound: fc.constant(true),
  }),
  fc.record({
    fault: fc.constant('lost-messages' as const),
    at,
    lasts,
    share: fc.constantFrom(0.05, 0.3, 1),
    of: fc.constantFrom('requests' as const, 'answers' as const, 'both' as const),
  }),
  fc.record({
    fault: fc.constant('slow-replication' as const),
    at,
    lasts,
    by: duration(1, 200),
    node: fc.integer({ min: 1, max: 3 }),
  }),
  fc.record({ fault: fc.constant('node-stopped' as const), at, lasts, node: fc.integer({ min: 1, max: 3 }) }),
)

export const anyFault = fc.oneof(
  { weight: 4, arbitrary: survivedFault },
  {
    weight: 1,
    arbitrary: fc.record({
      fault: fc.constant('handover' as const),
      at,
      keys: fc.constantFrom('**', 'berth/*', 'berth/1'),
      copying: duration(0, 200),
      staleRoutes: duration(0, 200),
      sound: fc.boolean(),
    }),
  },
  {
    weight: 1,
    arbitrary: fc.record({
      fault: fc.constant('two-leaders' as const),
      at,
      detect: duration(1, 150),
      lasts: duration(151, 500),
      stay: fc.constantFrom(0, 0.5, 1),
    }),
  },
  {
    weight: 1,
    arbitrary: fc.record({
      fault: fc.constant('lost-invalidations' as const),
      at,
      lasts,
      share: fc.constantFrom(0.1, 0.5, 1),
    }),
  },
)

export const anyWorkload = fc.record({
  lasts: fc.constant('1s'),
  clients: fc.integer({ min: 1, max: 8 }),
  hosts: fc.integer({ min: 1, max: 4 }),
  pause: fc.constantFrom('2ms', '10ms'),
  timeout: fc.constantFrom('20ms', '100ms'),
  retries: fc.record({
    times: fc.integer({ min: 1, max: 3 }),
    after: fc.constantFrom('5ms', '30ms'),
    of: fc.subarray(['increment', 'write', 'cas', 'read'] as ('increment' | 'write')[], { minLength: 1 }),
  }),
  berths: fc.integer({ min: 1, max: 4 }),
  sailings: fc.integer({ min: 0, max: 2 }),
  leases: fc.integer({ min: 0, max: 2 }),
  returnsCount: fc.boolean(),
})
