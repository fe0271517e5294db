/** Laws of every rehearsal, whatever its store and faults, as long as its clocks are true. */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import type { Scenario, ScenarioText } from '../../src/rehearsal/scenario-schema.js'
import { anyFault, anyWorkload, duration } from './arbitraries.js'
import { checked, isHarm, play, scenario } from './play.js'

const leading = fc.record({
  nodes: fc.integer({ min: 2, max: 5 }),
  replication: fc.constantFrom('async' as const, 'quorum' as const),
  reads: fc.constantFrom('leader' as const, 'unconfirmed-leader' as const, 'followers' as const),
  deduplicates: fc.boolean(),
  network: fc.constantFrom('100us', '1ms', '5ms'),
  lag: fc.constantFrom('100us', '5ms', '40ms'),
})
const cache = fc.record({
  keys: fc.constantFrom('**', 'berth/*', 'berth/1'),
  keeps: duration(1, 300),
  invalidates: fc.boolean(),
})

const withLeaders: fc.Arbitrary<Omit<ScenarioText, 'rehearsal'>> = fc
  .record({
    store: leading,
    cache: fc.option(cache, { nil: undefined }),
    workload: anyWorkload,
    faults: fc.array(anyFault, { maxLength: 4 }),
  })
  .map(({ store, cache, workload, faults }) => ({
    store: { ...store, ...(cache ? { cache } : {}) },
    workload,
    faults: faults
      .filter(({ fault }) => cache || fault !== 'lost-invalidations')
      .map((fault) => ('node' in fault ? { ...fault, node: Math.min(fault.node!, store.nodes) } : fault)),
  }))

const leaderless: fc.Arbitrary<Omit<ScenarioText, 'rehearsal'>> = fc
  .record({
    nodes: fc.integer({ min: 1, max: 5 }),
    writeQuorum: fc.integer({ min: 1, max: 5 }),
    readQuorum: fc.integer({ min: 1, max: 5 }),
    spreads: fc.boolean(),
    deduplicates: fc.boolean(),
    network: fc.constantFrom('100us', '1ms', '5ms'),
    workload: anyWorkload,
    faults: fc.array(anyFault, { maxLength: 3 }),
  })
  .map(({ nodes, writeQuorum, readQuorum, spreads, deduplicates, network, workload, faults }) => ({
    store: {
      replication: 'leaderless' as const,
      nodes,
      writeQuorum: Math.min(writeQuorum, nodes),
      readQuorum: Math.min(readQuorum, nodes),
      spreads,
      deduplicates,
      network,
    },
    workload: { ...workload, sailings: 0, leases: 0 },
    faults: faults
      .filter(({ fault }) => fault === 'lost-messages' || fault === 'node-stopped')
      .map((fault) => ('node' in fault ? { ...fault, node: Math.min(fault.node, nodes) } : fault)),
  }))

/** Values written again and again, and keys deleted; short, since it takes a search to decide them. */
const repeating = withLeaders.chain((text) =>
  fc
    .record({ vessels: fc.integer({ min: 1, max: 4 }), deletes: fc.constantFrom(0, 0.3) })
    .map((more) => ({ ...text, workload: { ...text.workload, clients: 3, pause: '15ms', ...more } })),
)

async function expectLaws(what: Scenario, seed: number): Promise<Set<string>> {
  const { history, hits } = play(what, seed)
  // A read of a value that was written twice may be explained by a write that it did not see.
  const isAmbiguous = what.workload.vessels !== undefined || what.workload.deletes > 0
  const harm = hits.filter(isHarm)
  expect(harm.filter(({ cause }) => cause === 'unknown')).toEqual([])
  const { findings, keys } = await checked(history)

  // A broken key was harmed, and so was an operation that its finding shows; not always on counters, where an increment
  // made a second time, long after it was acknowledged, stands out between two reads of others.
  const lines = new Set(harm.map(({ line }) => line))
  const strange = findings.filter(
    ({ key, operations }) => !key!.startsWith('sailing/') && !operations.some(({ line }) => lines.has(line)),
  )
  expect(strange.map(({ summary }) => summary)).toEqual([])
  const harmed = new Set(harm.map(({ key }) => key))
  const provable = new Set(hits.filter((hit) => hit.provable).map(({ key }) => key))
  for (const { key, verdicts } of keys) {
    const verdict = verdicts.linearizable
    if (verdict === 'broken') expect(harmed).toContain(key)
    if (verdict === 'undecided' || isAmbiguous) continue
    // Leases tie a version to the one before, which zones do not know.
    if (key.startsWith('berth/'))
      expect([key, verdict]).toEqual([key, provable.has(key) ? 'broken' : 'holds'])
    else if (provable.has(key)) expect([key, verdict]).toEqual([key, 'broken'])
  }
  return new Set(Object.values(keys).map(({ verdicts }) => verdicts.linearizable))
}

describe('any rehearsal', () => {
  it.each([
    ['with leaders', withLeaders, 150],
    ['without leaders', leaderless, 150],
    ['whose values repeat', repeating, 200],
  ])(
    '%s: what is broken was harmed, and what can be proven is found',
    async (_, text, numRuns) => {
      const verdicts = new Set<string>()
      await fc.assert(
        fc.asyncProperty(text, fc.nat(1_000_000), async (what, seed) => {
          for (const verdict of await expectLaws(scenario(what), seed)) verdicts.add(verdict)
        }),
        { numRuns: numRuns * Number(process.env.MISREAD_RUNS ?? 1) },
      )
      expect(verdicts).toContain('holds')
      expect(verdicts).toContain('broken')
    },
    240_000,
  )
})
