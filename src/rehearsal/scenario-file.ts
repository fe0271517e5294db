/**
 * Reads a scenario file (YAML or JSON) and says where what is wrong with it stands: what the schema finds, and what
 * cannot be together.
 */
import { parseSpec } from '../adapters/spec-file.js'
import { InputError, type InputProblem, PROBLEM_LIMIT } from '../history/problems.js'
import { keyGlob } from '../promises/glob.js'
import { keyNames } from './names.js'
import { type Scenario, scenarioSchema } from './scenario-schema.js'

/** Parses the text of a scenario file. Throws InputError with the place of each problem. */
export function parseScenario(text: string, file: string): Scenario {
  const parsed = parseSpec(text, file, scenarioSchema, 'bad-scenario')
  const problems: InputProblem[] = []
  for (const { path, found, expected, advice } of contradictions(parsed.spec))
    problems.push(parsed.problemAt(path, found, expected, advice))
  if (problems.length > 0) throw new InputError(problems.slice(0, PROBLEM_LIMIT))
  return parsed.spec
}

/** Something that a scenario cannot be, and where. */
export interface Contradiction {
  readonly path: readonly PropertyKey[]
  readonly found: string
  readonly expected: string
  readonly advice?: string
}

/** What each part allows and the whole does not. */
export function* contradictions({ store, workload, faults }: Scenario): Generator<Contradiction> {
  const { berths, sailings, leases, lasts, timeout, retries } = workload
  const names = keyNames(workload)
  if (names.length === 0)
    yield { path: ['workload'], found: 'no keys', expected: 'some berths, sailings or leases' }
  if (workload.pause === 0)
    yield { path: ['workload', 'pause'], found: 'no pause', expected: 'a duration of more than nothing' }
  if (timeout === 0)
    yield { path: ['workload', 'timeout'], found: 'no time', expected: 'a duration of more than nothing' }
  if (lasts === 0)
    yield { path: ['workload', 'lasts'], found: 'no time', expected: 'a duration of more than nothing' }
  if (retries && retries.after === 0) {
    yield {
      path: ['workload', 'retries', 'after'],
      found: 'no time',
      expected: 'a duration of more than nothing',
    }
  }
  const isLeaderless = store.replication === 'leaderless'
  if (isLeaderless && sailings + leases > 0) {
    yield {
      path: ['workload', sailings > 0 ? 'sailings' : 'leases'],
      found: sailings > 0 ? 'counters' : 'leases',
      expected: 'berths alone under leaderless replication, which knows neither increments nor cas',
      advice: `add sailings: 0${leases > 0 ? ' and leases: 0' : ''}`,
    }
  }
  if (isLeaderless && berths > 0 && store.reads !== 'leader')
    yield { path: ['store', 'reads'], found: store.reads, expected: 'no reads under leaderless replication' }
  for (const name of ['writeQuorum', 'readQuorum'] as const) {
    const size = store[name]
    if (size === undefined) continue
    if (!isLeaderless)
      yield {
        path: ['store', name],
        found: `${name} ${size}`,
        expected: 'it under leaderless replication only',
      }
    else if (size > store.nodes)
      yield { path: ['store', name], found: `${name} ${size}`, expected: `at most the ${store.nodes} nodes` }
  }
  if (store.cache && !names.some(keyGlob(store.cache.keys)))
    yield { path: ['store', 'cache', 'keys'], ...noKey(store.cache.keys, names) }

  for (const [i, fault] of faults.entries()) {
    const at = ['faults', i] as const
    if (fault.at >= lasts) {
      yield {
        path: [...at, 'at'],
        found: 'a fault after the end',
        expected: `a time before workload.lasts, ${lasts / 1e9}s`,
      }
    }
    if (fault.every === 0)
      yield { path: [...at, 'every'], found: 'no time', expected: 'a duration of more than nothing' }
    if ('node' in fault && fault.node !== undefined && fault.node > store.nodes)
      yield { path: [...at, 'node'], found: `node ${fault.node}`, expected: `1 to ${store.nodes}, the nodes` }
    if (fault.fault === 'handover' && !names.some(keyGlob(fault.keys)))
      yield { path: [...at, 'keys'], ...noKey(fault.keys, names) }
    if (fault.fault === 'lost-invalidations' && !store.cache)
      yield { path: [...at, 'fault'], found: fault.fault, expected: 'a store with a cache (store.cache)' }
    const needsLeader = ['failover', 'two-leaders', 'handover', 'slow-replication'].includes(fault.fault)
    if (needsLeader && isLeaderless)
      yield { path: [...at, 'fault'], found: fault.fault, expected: 'a store with a leader' }
    else if (needsLeader && store.nodes < 2)
      yield { path: [...at, 'fault'], found: fault.fault, expected: 'a store of two nodes or more' }
    if ((fault.fault === 'failover' || fault.fault === 'two-leaders') && fault.lasts <= fault.detect)
      yield {
        path: [...at, 'detect'],
        found: 'an end before another node leads',
        expected: 'lasts above detect',
      }
    if (fault.every !== undefined && fault.every > 0 && fault.every <= spanOf(fault))
      yield {
        path: [...at, 'every'],
        found: 'a fault that begins again before it is over',
        expected: 'more than it lasts',
      }
  }
}

/** Nanoseconds from a fault's beginning to its end. */
function spanOf(fault: Scenario['faults'][number]): number {
  return fault.fault === 'handover' ? fault.copying + fault.staleRoutes : fault.lasts
}

function noKey(glob: string, names: readonly string[]): { found: string; expected: string } {
  return {
    found: JSON.stringify(glob),
    expected: `a glob that some key matches, ${names[0] ?? 'berth/1'} say`,
  }
}
