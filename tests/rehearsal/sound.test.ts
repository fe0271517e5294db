/**
 * What keeps its promise is never accused: a quorum store, whatever befalls it; and each fault with what guards against
 * it.
 */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import type { Scenario, ScenarioText } from '../../src/rehearsal/scenario-schema.js'
import { anyWorkload, survivedFault } from './arbitraries.js'
import { checked, isHarm, named, play, scenario } from './play.js'

async function expectHolds(what: Scenario, seed: number, promise = 'linearizable'): Promise<void> {
  const { history, hits } = play(what, seed)
  expect(hits.filter(isHarm), `seed ${seed}`).toEqual([])
  const { findings, promises } = await checked(history, promise)
  expect(
    findings.map(({ summary }) => summary),
    `seed ${seed}`,
  ).toEqual([])
  expect(promises[0].verdict, `seed ${seed}`).toBe('holds')
}

const short = (what: Scenario): Scenario => ({
  ...what,
  workload: { ...what.workload, lasts: 1_000_000_000 },
})

describe('a quorum store', () => {
  it('without faults holds, over three hundred seeds', async () => {
    for (let seed = 1; seed <= 300; seed++) await expectHolds(short(named('sound')), seed)
  })

  it('holds under faults that it survives, over two hundred seeds', async () => {
    for (let seed = 1; seed <= 200; seed++) await expectHolds(named('sound-under-faults'), seed)
  }, 120_000)

  it('holds with requests that time out', async () => {
    for (let seed = 1; seed <= 100; seed++) await expectHolds(named('time-outs'), seed)
  })

  it('is accused of nothing where keys are deleted and values repeat', async () => {
    const what = scenario({
      workload: { lasts: '1s', deletes: 0.3, vessels: 3 },
      faults: [{ fault: 'failover', at: '300ms' }],
    })
    for (let seed = 1; seed <= 50; seed++) {
      const { history } = play(what, seed)
      expect((await checked(history)).findings).toEqual([])
    }
  })
})

describe('what guards against a fault', () => {
  const leases = { lasts: '2s', leases: 2 }
  const cases: [string, Omit<ScenarioText, 'rehearsal'>][] = [
    ['an asynchronous leader that is read and never lost', { store: { replication: 'async', lag: '50ms' } }],
    [
      'quorums against a failover',
      { store: { lag: '10ms' }, workload: leases, faults: [{ fault: 'failover', at: '500ms' }] },
    ],
    [
      'quorums and confirmed reads against two leaders',
      { workload: leases, faults: [{ fault: 'two-leaders', at: '500ms', stay: 1 }] },
    ],
    [
      'deduplication against retries',
      {
        store: { deduplicates: true },
        workload: { ...leases, retries: { times: 3, after: '15ms', of: ['increment', 'write', 'cas'] } },
        faults: [{ fault: 'lost-messages', at: '200ms', lasts: '1500ms', share: 0.2 }],
      },
    ],
    [
      'an owner that turns writers away against a handover',
      {
        store: { replication: 'async' },
        workload: leases,
        faults: [{ fault: 'handover', at: '500ms', keys: '**', sound: true }],
      },
    ],
  ]
  it.each(cases)('%s', async (_, text) => {
    for (let seed = 1; seed <= 25; seed++) await expectHolds(scenario(text), seed)
  })

  it('confirmed reads: without them two leaders show stale reads, and lose nothing', async () => {
    const what = scenario({
      store: { reads: 'unconfirmed-leader' },
      workload: { lasts: '2s', sailings: 0, reads: 0.9, readBack: 0 },
      faults: [{ fault: 'two-leaders', at: '500ms', lasts: '1s' }],
    })
    const kinds = new Set<string>()
    for (let seed = 1; seed <= 25; seed++) {
      const { history, hits } = play(what, seed)
      expect(hits.filter(({ effect }) => effect === 'lost')).toEqual([])
      for (const { kind } of (await checked(history)).findings) kinds.add(kind)
    }
    expect(kinds).toContain('stale-read')
    expect(['stale-read', 'own-write-missed', 'backward-read', 'reverted-value']).toEqual(
      expect.arrayContaining([...kinds]),
    )
  })

  // Lamport 1986: quorums that meet, without repair, make a regular register; it is not atomic.
  it('quorums that meet are regular', async () => {
    for (let seed = 1; seed <= 50; seed++) {
      const { history } = play(named('meeting-quorums'), seed)
      expect((await checked(history, 'regular')).promises[0].verdict, `seed ${seed}`).toBe('holds')
    }
  })
})

describe('any scenario of a quorum store', () => {
  const text = fc.record({
    store: fc.record({
      nodes: fc.integer({ min: 3, max: 5 }),
      network: fc.constantFrom('100us', '1ms', '5ms'),
      lag: fc.constantFrom('100us', '2ms', '10ms'),
    }),
    workload: anyWorkload,
    clocks: fc.constantFrom({}, { stated: '5ms', off: '4ms', drift: '500us' }),
    faults: fc.array(survivedFault, { maxLength: 4 }),
  })

  it('holds', async () => {
    await fc.assert(
      fc.asyncProperty(text, fc.nat(1_000_000), async (what, seed) => expectHolds(scenario(what), seed)),
      { numRuns: 300 * Number(process.env.MISREAD_RUNS ?? 1) },
    )
  }, 120_000)
})
