import { spawnSync } from 'node:child_process'
import { readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import { recordSchema } from '../../src/history/format.js'
import { rehearse } from '../../src/rehearsal/rehearse.js'
import { SCENARIOS } from '../../src/rehearsal/scenarios.js'
import { truthSchema } from '../../src/rehearsal/truth-schema.js'
import { checked, digest, named, play, scenario } from './play.js'

/** SHA-256 of history and truth of seed 1. A change of the simulation changes them; another machine does not. */
const DIGESTS: Record<string, string> = JSON.parse(readFileSync('tests/rehearsal/digests.json', 'utf8'))

describe.each(SCENARIOS.map(({ name }) => name))('the rehearsal of %s', (name) => {
  it('is the same text for the same seed, on every machine, and another for another', () => {
    expect(digest(name)).toBe(DIGESTS[name])
    expect(play(named(name), 2).history).not.toBe(play(named(name), 1).history)
  })

  it('records what the format allows, and counts it', () => {
    const { history, account, hits, truth } = play(named(name), 3)
    const records = history
      .trimEnd()
      .split('\n')
      .map((line) => JSON.parse(line))
    for (const record of records)
      expect(recordSchema.safeParse(record).success, JSON.stringify(record)).toBe(true)
    for (const line of truth.trimEnd().split('\n'))
      expect(truthSchema.safeParse(JSON.parse(line)).success, line).toBe(true)
    const operations = records.filter(({ op }) => op !== undefined)
    expect(operations).toHaveLength(account.operations)
    const unsure = operations.filter(({ outcome }) => outcome === 'unsure').length
    const refused = operations.filter(({ outcome }) => outcome === 'refused').length
    expect(account.outcomes).toEqual({ acked: operations.length - unsure - refused, refused, unsure })
    expect(account.hits.reduce((sum, { count }) => sum + count, 0)).toBe(hits.length)
    expect(JSON.parse(truth.trimEnd().split('\n').at(-1)!)).toEqual({ summary: account })
    // Every unsure request is one that the truth knows of, and the other way round.
    expect(hits.filter(({ effect }) => effect === 'unsure')).toHaveLength(unsure)
    for (const { line, client, op, key } of hits) expect(records[line - 1]).toMatchObject({ client, op, key })
  })
})

describe('what the truth says of unsure requests', () => {
  it('is true: what was not carried out by then, nor later, nobody reads', () => {
    for (let seed = 1; seed <= 20; seed++) {
      const { history, hits } = play(named('time-outs'), seed)
      const records = history
        .trimEnd()
        .split('\n')
        .map((line) => JSON.parse(line))
      const read = new Set(records.filter(({ op }) => op === 'read').map(({ value }) => value))
      const late = new Set(hits.filter(({ effect }) => effect === 'late').map(({ line }) => line))
      const never = hits.filter(
        ({ effect, op, carriedOut, line }) =>
          effect === 'unsure' && op === 'write' && carriedOut === false && !late.has(line),
      )
      expect(never.length).toBeGreaterThan(0)
      for (const { line } of never) expect(read).not.toContain(records[line - 1].value)
    }
  })
})

describe('a rehearsal', () => {
  it('streams: a piece is small, however long it all takes', () => {
    const what = scenario({ workload: { lasts: '60s', clients: 20, pause: '5ms' } })
    let pieces = 0
    let largest = 0
    const run = rehearse(what, 1)
    for (let step = run.next(); !step.done; step = run.next()) {
      pieces++
      largest = Math.max(largest, step.value.history.length + step.value.truth.length)
    }
    expect(pieces).toBeGreaterThan(100)
    expect(largest).toBeLessThan(70_000)
  })

  it('keeps nothing of the past: half a million operations in little memory', () => {
    const script = `
      import { rehearse } from './src/rehearsal/rehearse.ts'
      import { scenarioSchema } from './src/rehearsal/scenario-schema.ts'
      const scenario = scenarioSchema.parse({
        rehearsal: 1,
        store: { replication: 'async' },
        workload: { lasts: '600s', clients: 10, leases: 2, retries: {} },
        faults: [{ fault: 'failover', at: '5s', every: '10s' }],
      })
      const run = rehearse(scenario, 1)
      let step = run.next()
      while (!step.done) step = run.next()
      console.log(step.value.operations)`
    const args = ['--max-old-space-size=80', '--import', 'tsx', '--input-type=module', '--eval', script]
    const { stdout, stderr } = spawnSync(process.execPath, args, { encoding: 'utf8' })
    expect(stderr).toBe('')
    expect(Number(stdout)).toBeGreaterThan(300_000)
  })

  it('ends with every key read by several clients', () => {
    const what = scenario({ workload: { lasts: '100ms', closingReads: 3, berths: 5, sailings: 1 } })
    const { history } = play(what, 1)
    const closing = history
      .trimEnd()
      .split('\n')
      .slice(-18)
      .map((line) => JSON.parse(line))
    const readers = new Map<string, Set<string>>()
    for (const { op, key, client } of closing) {
      expect(op).toBe('read')
      readers.set(key, (readers.get(key) ?? new Set()).add(client))
    }
    expect([...readers.values()].map(({ size }) => size)).toEqual([3, 3, 3, 3, 3, 3])
  })

  it('knows one key, one client, one node', async () => {
    const what = scenario({
      store: { nodes: 1 },
      workload: { lasts: '500ms', clients: 1, hosts: 1, berths: 1, sailings: 0 },
    })
    const { history } = play(what, 1)
    expect((await checked(history)).promises[0].verdict).toBe('holds')
  })

  it('leaves nothing to one clock: the core asks no other', () => {
    const { random } = Math
    const { now } = Date
    Math.random = Date.now = () => {
      throw new Error('not pure')
    }
    try {
      for (const { name } of SCENARIOS) play(named(name), 4)
    } finally {
      Math.random = random
      Date.now = now
    }
  })
})
