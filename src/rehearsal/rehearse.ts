/**
 * A rehearsal: a store that is simulated, with its clients and faults, as a history and the truth beside it. The same
 * scenario and seed make the same text, on every machine.
 */
import { keyGlob } from '../promises/glob.js'
import { CachedStore } from './cached-store.js'
import { Client } from './client.js'
import { Clocks } from './clocks.js'
import { scheduleFaults } from './faults.js'
import { LeaderStore } from './leader-store.js'
import { hostName, type KeyKind, keyNames } from './names.js'
import { Network } from './network.js'
import { type Cell, type Key, newVersion } from './operation.js'
import { Output, type Piece } from './output.js'
import { QuorumStore } from './quorum-store.js'
import { randomStreams } from './random.js'
import { Referee } from './referee.js'
import type { Scenario } from './scenario-schema.js'
import { Scheduler } from './scheduler.js'
import type { Store } from './store.js'
import type { Account } from './truth-schema.js'
import { Vessels } from './vessels.js'

/** Characters of a piece. */
const PIECE = 1 << 16

/**
 * Plays a scenario. Yields the history and the truth piece by piece, so that size does not matter; both are NDJSON.
 * Returns what it came to. `seed`: a whole number of 32 bits.
 */
export function* rehearse(
  scenario: Scenario,
  seed: number,
  onProgress?: (time: number, lasts: number) => void,
): Generator<Piece, Account> {
  const { store, workload, clocks: clockSpec, title } = scenario
  const [clockRandom, networkRandom, storeRandom, clientRandom] = randomStreams(seed, 4)
  const scheduler = new Scheduler()
  const clocks = new Clocks(scenario, clockRandom)
  const output = new Output(clocks, workload.returnsCount)
  const network = new Network(scheduler, networkRandom, store, store.nodes)
  const keys = makeKeys(scenario)
  const cells = Array.from(keys.values())
  const referee = new Referee(scheduler, output, keys, workload, () => network.slow.keys().next().value)
  const mark = (text: string, from: number, isInstant = false): void =>
    output.mark(text, from, isInstant ? undefined : scheduler.now)
  const { clients } = workload
  const parts = { scheduler, network, referee, random: storeRandom, clients, mark }

  const leaders =
    store.replication === 'leaderless'
      ? undefined
      : new LeaderStore({ ...parts, store, keys: [...keys.keys()] }, cells)
  const plain: Store = leaders ?? new QuorumStore(parts, store, cells)
  const cache = store.cache ? new CachedStore(parts, store.cache, plain) : undefined

  output.write({ history: 1, title, clockError: clockSpec.stated })
  output.state({ truth: 1, title, seed })
  clocks.offsets.forEach((_, host) => {
    const furthest = Math.max(...[0, workload.lasts].map((time) => Math.abs(clocks.error(host, time))))
    output.state({
      host: hostName(host),
      offNs: clocks.error(host, 0),
      driftNsPerSecond: clocks.drifts[host],
      isWithinStated: furthest <= clockSpec.stated,
    })
  })
  scheduleFaults(scenario, { scheduler, network, leaders, cache, mark })

  let operations = 0
  const vessels = new Vessels(clientRandom, workload.vessels)
  const closing = closingReads([...keys.keys()], workload)
  for (let number = 0; number < clients; number++) {
    new Client(
      number,
      {
        scheduler,
        random: clientRandom,
        store: cache ?? plain,
        referee,
        output,
        vessels,
        workload,
        keys: [...keys.keys()],
        onEnd: () => {
          operations++
        },
      },
      closing[number],
    ).begin()
  }
  while (scheduler.step()) {
    if (output.size < PIECE) continue
    onProgress?.(scheduler.now, workload.lasts)
    yield output.take()
  }
  const hits = [...output.hits.values()].sort(
    (a, b) => compare(a.effect, b.effect) || compare(a.cause, b.cause),
  )
  const account = { operations, outcomes: output.outcomes, hits }
  output.state({ summary: account })
  yield output.take()
  return account
}

/** The keys of a scenario, each with what it holds at first. */
function makeKeys({ workload, store }: Scenario): Map<Key, Cell> {
  const isCached = store.cache ? keyGlob(store.cache.keys) : () => false
  return new Map(
    keyNames(workload).map((name, index) => {
      const cell: Cell = { rank: 0, by: undefined, version: newVersion('null'), count: 0 }
      const kind = name.slice(0, name.indexOf('/')) as KeyKind
      const key: Key = {
        index,
        name,
        kind,
        isCached: isCached(name),
        region: undefined,
        isMoving: false,
        former: undefined,
        known: cell,
      }
      return [key, cell]
    }),
  )
}

/** By client: the keys that it reads once all is over. */
function closingReads(keys: readonly Key[], { clients, closingReads }: Scenario['workload']): Key[][] {
  const closing = Array.from({ length: clients }, (): Key[] => [])
  for (let i = 0; i < keys.length * closingReads; i++)
    closing[i % clients].push(keys[Math.floor(i / closingReads)])
  return closing
}

function compare(a: string, b: string): number {
  return a < b ? -1 : a > b ? 1 : 0
}
