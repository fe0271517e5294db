import { describe, expect, it } from 'vitest'
import { stringify } from 'yaml'
import { formatProblem, InputError } from '../../src/history/problems.js'
import { parseScenario } from '../../src/rehearsal/scenario-file.js'
import { SCENARIOS } from '../../src/rehearsal/scenarios.js'
import { named } from './play.js'

function problems(text: string): string[] {
  try {
    parseScenario(text, 'my.yaml')
    return []
  } catch (error) {
    if (!(error instanceof InputError)) throw error
    return error.problems.map(formatProblem)
  }
}

describe('a scenario file', () => {
  it('may be YAML or JSON, and needs a line alone', () => {
    expect(parseScenario('rehearsal: 1', 'my.yaml')).toEqual(parseScenario('{"rehearsal": 1}', 'my.json'))
    expect(parseScenario('rehearsal: 1', 'my.yaml')).toMatchObject({
      store: { nodes: 3, replication: 'quorum', network: 500_000 },
      workload: { clients: 8, lasts: 3_000_000_000 },
      faults: [],
    })
  })

  it.each(SCENARIOS.map(({ name }) => name))('%s comes out as it went in', (name) => {
    const { text } = SCENARIOS.find((each) => each.name === name)!
    expect(parseScenario(stringify(text), 'my.yaml')).toEqual(named(name))
  })

  it('reads durations to the nanosecond, up to a week', () => {
    const network = (text: string): number =>
      parseScenario(`{rehearsal: 1, store: {network: ${text}}}`, 'x').store.network
    expect(['1ns', '150us', '2.5ms', '0.000000001s', '168h'].map(network)).toEqual([
      1, 150_000, 2_500_000, 1, 604_800e9,
    ])
    expect(problems('{rehearsal: 1, store: {network: 169h}}')).toHaveLength(1)
  })

  // What stands in the file, and what is said of it.
  it.each([
    ['', 'my.yaml:1:1: found nothing'],
    ['rehearsal: 2', 'my.yaml:1:12: found "2", expected 1'],
    ['rehearsal: [', 'my.yaml:1:13: found'],
    [
      'rehearsal: 1\nstore: {replicaton: async}',
      'my.yaml:2:9: found "replicaton", expected nodes, replication',
    ],
    ['rehearsal: 1\nstore: {nodes: 31}', 'my.yaml:2:16: found "31", expected at most 30'],
    ['rehearsal: 1\nstore: {nodes: 0}', 'my.yaml:2:16: found "0", expected 1 or more'],
    ['rehearsal: 1\nstore: {nodes: 2.5}', 'my.yaml:2:16: found "2.5", expected a whole number'],
    ['rehearsal: 1\nstore: {network: 5}', 'my.yaml:2:18: found "5", expected a duration'],
    ['rehearsal: 1\nworkload: {reads: 1.5}', 'my.yaml:2:19: found "1.5", expected at most 1'],
    ['rehearsal: 1\nworkload: {lasts: soon}', 'my.yaml:2:19: found "soon", expected a duration'],
    ['rehearsal: 1\nworkload: {pause: 0s}', 'my.yaml:2:19: found no pause'],
    ['rehearsal: 1\nworkload: {timeout: 0s}', 'my.yaml:2:21: found no time'],
    ['rehearsal: 1\nworkload: {berths: 0, sailings: 0}', 'my.yaml:2:11: found no keys'],
    ['rehearsal: 1\nfaults:\n  - fault: fire\n    at: 1s', 'my.yaml:3:12: found "fire", expected failover,'],
    ['rehearsal: 1\nfaults:\n  - at: 1s', 'my.yaml:3:5: found no fault, expected failover,'],
    ['rehearsal: 1\nfaults:\n  - {fault: failover, at: 9s}', 'my.yaml:3:27: found a fault after the end'],
    [
      'rehearsal: 1\nfaults:\n  - {fault: failover, at: 1s, detect: 2s}',
      'my.yaml:3:39: found an end before another',
    ],
    [
      'rehearsal: 1\nfaults:\n  - {fault: failover, at: 1s, every: 9ms}',
      'my.yaml:3:38: found a fault that begins',
    ],
    [
      'rehearsal: 1\nfaults:\n  - {fault: handover, at: 1s, keys: gate/*}',
      'my.yaml:3:37: found "gate/*", expected a glob',
    ],
    [
      'rehearsal: 1\nfaults:\n  - {fault: node-stopped, at: 1s, lasts: 1s, node: 4}',
      'my.yaml:3:52: found node 4',
    ],
    [
      'rehearsal: 1\nfaults:\n  - {fault: lost-invalidations, at: 1s, lasts: 1s}',
      'my.yaml:3:13: found lost-invalidations, expected a store with a cache',
    ],
    [
      'rehearsal: 1\nstore: {writeQuorum: 2}',
      'my.yaml:2:22: found writeQuorum 2, expected it under leaderless',
    ],
    [
      'rehearsal: 1\nstore: {replication: leaderless}',
      'found counters, expected berths alone under leaderless',
    ],
    ['rehearsal: 1\nstore: {cache: {keys: gate/*}}', 'my.yaml:2:23: found "gate/*"'],
    [
      'rehearsal: 1\nstore: {nodes: 1}\nfaults: [{fault: failover, at: 1s}]',
      'my.yaml:3:18: found failover, expected a store of two',
    ],
    [
      'rehearsal: 1\nstore: {replication: leaderless}\nworkload: {sailings: 0}\nfaults: [{fault: failover, at: 1s}]',
      'expected a store with a leader',
    ],
  ])('%j is refused at its place', (text, expected) => {
    expect(problems(text)).toHaveLength(1)
    expect(problems(text)[0]).toContain(expected)
  })
})
