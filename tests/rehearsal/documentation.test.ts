/** What docs/rehearsal.md shows is what comes out, and what it claims of the scenarios is so. */
import { readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import { parseScenario } from '../../src/rehearsal/scenario-file.js'
import type { Scenario } from '../../src/rehearsal/scenario-schema.js'
import { shownOn, today } from './page.js'
import { checked, isHarm, named, play } from './play.js'

const page = readFileSync('docs/rehearsal.md', 'utf8')
describe('docs/rehearsal.md', () => {
  it('shows every fault', () => {
    expect(shownOn(page).length).toBeGreaterThanOrEqual(10)
  })

  it.each(shownOn(page))(
    'shows the output of $name, seed $seed, but for what it leaves out',
    async (shown) => {
      // Where what is said has changed on purpose: npx tsx tests/rehearsal/rewrite-page.ts
      expect(await today(shown)).toBe(shown.text)
    },
  )

  it('has a scenario that is one, and lines of the truth that are there', () => {
    const [, scenario] = /```yaml\n(rehearsal: 1[\s\S]*?)```/.exec(page)!
    expect(() => parseScenario(scenario, 'docs')).not.toThrow()
    const { truth } = play(named('failover'), 1)
    const [, lines] = /```json\n([\s\S]*?)\n```/.exec(page)!
    for (const line of lines.split('\n')) expect(truth.split('\n')).toContain(line)
  })
})

describe('what docs/rehearsal.md claims', () => {
  const SEEDS = 10
  const store = (name: string, more: Partial<Scenario['store']>): Scenario => {
    const what = named(name)
    return { ...what, store: { ...what.store, ...more } }
  }
  const soundHandover = (): Scenario => {
    const what = named('handover')
    return {
      ...what,
      faults: what.faults.map((fault) => (fault.fault === 'handover' ? { ...fault, sound: true } : fault)),
    }
  }

  it.each<[string, Scenario, string]>([
    ['failover under quorum replication', store('failover', { replication: 'quorum' }), 'linearizable'],
    ['two leaders under quorum replication', store('two-leaders', { replication: 'quorum' }), 'linearizable'],
    ['retries that are deduplicated', store('retries', { deduplicates: true }), 'linearizable'],
    ['a sound handover', soundHandover(), 'linearizable'],
    ['reads from followers, once replicas have caught up', named('follower-reads'), 'durable'],
    ['a cache, after a while', named('cache'), 'bounded-staleness within=300ms'],
    ['a cache, at the end', named('cache'), 'durable'],
    ['meeting quorums', named('meeting-quorums'), 'regular'],
  ])('%s: holds', async (_, what, promise) => {
    for (let seed = 1; seed <= SEEDS; seed++)
      expect((await checked(play(what, seed).history, promise)).promises[0].verdict, `seed ${seed}`).toBe(
        'holds',
      )
  })

  it('time-outs that are recorded as refused accuse a sound store', async () => {
    for (let seed = 1; seed <= SEEDS; seed++) {
      const { history, hits } = play(named('time-outs'), seed)
      expect(hits.filter(isHarm)).toEqual([])
      const { findings } = await checked(history.replaceAll('"outcome":"unsure"', '"outcome":"refused"'))
      expect(findings.map(({ kind }) => kind)).toContain('refused-write-seen')
    }
  })

  it('compare-and-sets that are sent again are found taken', async () => {
    const what = named('retries')
    const { workload } = what
    const worse: Scenario = {
      ...what,
      workload: {
        ...workload,
        leases: 2,
        retries: { ...workload.retries!, of: ['increment', 'write', 'cas'] },
      },
    }
    for (let seed = 1; seed <= SEEDS; seed++) {
      const { findings } = await checked(play(worse, seed).history)
      expect(findings.map(({ kind }) => kind)).toContain('refused-write-seen')
    }
  })

  it('only keys of the range are broken by a handover', async () => {
    for (let seed = 1; seed <= SEEDS; seed++)
      for (const { key, verdicts } of (await checked(play(named('handover'), seed).history)).keys)
        if (verdicts.linearizable === 'broken') expect(key).toMatch(/^berth\/(.|1.)$/)
  })

  it('the drill for CI ends as it should', async () => {
    const drill = play(named('failover'), 1).history
    expect((await checked(drill, 'durable settle=500ms')).exit).toBe(1)
    expect((await checked(play(named('sound-under-faults'), 1).history)).exit).toBe(0)
  })
})
