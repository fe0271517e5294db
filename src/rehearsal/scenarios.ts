/**
 * The scenarios that are known by name. A name's text is a scenario file like any other.
 */
import type { ScenarioText } from './scenario-schema.js'

export interface NamedScenario {
  readonly name: string
  /** in a few words */
  readonly about: string
  readonly text: ScenarioText
}

export const SCENARIOS: readonly NamedScenario[] = [
  {
    name: 'sound',
    about: 'a quorum store without faults',
    text: {
      rehearsal: 1,
      title: 'a quorum store without faults',
      store: { replication: 'quorum' },
      workload: { leases: 2, returnsCount: true },
    },
  },
  {
    name: 'sound-under-faults',
    about: 'a quorum store that loses its leader, messages, and its way, and keeps its promise',
    text: {
      rehearsal: 1,
      title: 'a quorum store under faults that it survives',
      store: { replication: 'quorum' },
      workload: {
        lasts: '6s',
        leases: 2,
        retries: { times: 2, after: '30ms', of: ['increment', 'write', 'cas'] },
      },
      clocks: { stated: '2ms', off: '1ms', drift: '100us' },
      faults: [
        { fault: 'failover', at: '500ms', every: '3s' },
        { fault: 'two-leaders', at: '1500ms', every: '3s' },
        { fault: 'handover', at: '2400ms', keys: 'berth/*', sound: true },
        { fault: 'lost-messages', at: '2500ms', lasts: '1s', share: 0.1 },
        { fault: 'slow-replication', at: '100ms', lasts: '300ms', by: '50ms' },
        { fault: 'node-stopped', at: '5200ms', lasts: '500ms', node: 3 },
      ],
    },
  },
  {
    name: 'follower-reads',
    about: 'replicas that lag, and clients that read from them',
    text: {
      rehearsal: 1,
      title: 'reads from followers that lag',
      store: { replication: 'async', reads: 'followers' },
      faults: [{ fault: 'slow-replication', at: '500ms', lasts: '2s', by: '40ms' }],
    },
  },
  {
    name: 'cache',
    about: 'a look-aside cache, filled by readers that are overtaken, with invalidations lost',
    text: {
      rehearsal: 1,
      title: 'a look-aside cache before a quorum store',
      store: { replication: 'quorum', cache: { keys: 'berth/*', keeps: '200ms' } },
      workload: { lasts: '5s', berths: 4, pause: '4ms', reads: 0.7 },
      faults: [{ fault: 'lost-invalidations', at: '2s', lasts: '2s', share: 0.3 }],
    },
  },
  {
    name: 'failover',
    about: 'an asynchronous leader dies, and the next one lacks the end of its log',
    text: {
      rehearsal: 1,
      title: 'failover under asynchronous replication',
      store: { replication: 'async', lag: '30ms' },
      workload: { berths: 24, leases: 2 },
      faults: [{ fault: 'failover', at: '1s', every: '1800ms' }],
    },
  },
  {
    name: 'two-leaders',
    about: 'a leader cut off from the others goes on beside the new one',
    text: {
      rehearsal: 1,
      title: 'two leaders at once',
      store: { replication: 'async' },
      workload: { leases: 2 },
      faults: [{ fault: 'two-leaders', at: '1s', lasts: '800ms' }],
    },
  },
  {
    name: 'retries',
    about: 'answers are lost, and the client library sends increments again',
    text: {
      rehearsal: 1,
      title: 'increments that are sent again',
      store: { replication: 'quorum', deduplicates: false },
      workload: { sailings: 4, berths: 4, retries: { times: 2, after: '20ms', of: ['increment'] } },
      faults: [{ fault: 'lost-messages', at: '500ms', lasts: '2s', share: 0.1, of: 'answers' }],
    },
  },
  {
    name: 'handover',
    about: 'keys are handed to another node while they are written',
    text: {
      rehearsal: 1,
      title: 'berths handed over while they are written',
      store: { replication: 'quorum' },
      workload: { berths: 20 },
      faults: [
        { fault: 'handover', at: '1s', keys: 'berth/?', copying: '150ms', staleRoutes: '150ms' },
        { fault: 'handover', at: '2700ms', keys: 'berth/1?', copying: '150ms', staleRoutes: '150ms' },
      ],
    },
  },
  {
    name: 'time-outs',
    about: 'requests and answers are lost, and clients give up not knowing',
    text: {
      rehearsal: 1,
      title: 'requests that time out',
      store: { replication: 'quorum' },
      workload: { timeout: '40ms', leases: 1 },
      faults: [
        { fault: 'lost-messages', at: '500ms', lasts: '2s', share: 0.1 },
        { fault: 'slow-replication', at: '1s', lasts: '1s', by: '20ms' },
      ],
    },
  },
  {
    name: 'clocks-within',
    about: 'a sound store, recorded with clocks that are off by less than is stated',
    text: {
      rehearsal: 1,
      title: 'clocks off by less than stated',
      store: { replication: 'quorum' },
      workload: { leases: 1 },
      clocks: { stated: '20ms', off: '15ms', drift: '1ms' },
    },
  },
  {
    name: 'clocks-beyond',
    about: 'a sound store, recorded with clocks that are off by more than is stated',
    text: {
      rehearsal: 1,
      title: 'clocks off by more than stated',
      store: { replication: 'quorum' },
      clocks: { stated: '1ms', off: '20ms', drift: '1ms' },
    },
  },
  {
    name: 'small-quorums',
    about: 'random quorums that need not meet',
    text: {
      rehearsal: 1,
      title: 'three nodes, one asked, one told',
      store: { replication: 'leaderless', writeQuorum: 1, readQuorum: 1 },
      workload: { sailings: 0 },
      faults: [{ fault: 'lost-messages', at: '1s', lasts: '1s', share: 0.1, of: 'requests' }],
    },
  },
  {
    name: 'meeting-quorums',
    about: 'random quorums that always meet, and writes that reach one node only: regular, not linearizable',
    text: {
      rehearsal: 1,
      title: 'three nodes, two asked, two told',
      store: { replication: 'leaderless', writeQuorum: 2, readQuorum: 2 },
      workload: { sailings: 0, reads: 0.7 },
      faults: [{ fault: 'lost-messages', at: '500ms', lasts: '2s', share: 0.2, of: 'requests' }],
    },
  },
  {
    name: 'repeated-values',
    about: 'values written again and again: reads no longer name their write',
    text: {
      rehearsal: 1,
      title: 'four vessels, again and again',
      store: { replication: 'async', reads: 'followers', lag: '20ms' },
      workload: { vessels: 4, deletes: 0.1 },
    },
  },
]
