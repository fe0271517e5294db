/**
 * Lets the faults of a scenario strike at their times.
 */
import type { CachedStore } from './cached-store.js'
import type { FaultRun } from './fault-run.js'
import type { LeaderStore } from './leader-store.js'
import { nodeName } from './names.js'
import type { Network } from './network.js'
import type { FaultSpec, Scenario } from './scenario-schema.js'
import type { Scheduler } from './scheduler.js'

export interface Stricken {
  readonly scheduler: Scheduler
  readonly network: Network
  /** undefined where the store has no leaders, or no cache */
  readonly leaders: LeaderStore | undefined
  readonly cache: CachedStore | undefined
  readonly mark: (text: string, from: number) => void
}

export function scheduleFaults({ faults, workload }: Scenario, stricken: Stricken): void {
  for (const [i, spec] of faults.entries()) {
    for (let at = spec.at; at < workload.lasts; at += spec.every ?? workload.lasts) {
      const run: FaultRun = { number: i + 1, spec }
      stricken.scheduler.at(at, () => strike(run, spec, stricken))
    }
  }
}

function strike(
  run: FaultRun,
  spec: FaultSpec,
  { scheduler, network, leaders, cache, mark }: Stricken,
): void {
  const from = scheduler.now
  const until = (lasts: number, text: string, end: () => void): void =>
    scheduler.after(lasts, () => {
      end()
      mark(text, from)
    })
  switch (spec.fault) {
    case 'failover':
      leaders!.failover(run, spec)
      return
    case 'two-leaders':
      leaders!.twoLeaders(run, spec)
      return
    case 'handover':
      leaders!.handover(run, spec)
      return
    case 'node-stopped':
      if (leaders) leaders.nodeStopped(run, spec)
      else stop(run, spec.node - 1, spec.lasts, network, until)
      return
    case 'lost-messages':
      network.losses.set(run, spec)
      until(spec.lasts, `${percent(spec.share)} of ${messages(spec.of)} lost`, () =>
        network.losses.delete(run),
      )
      return
    case 'slow-replication': {
      const node = spec.node === undefined ? undefined : spec.node - 1
      network.slow.set(run, { by: spec.by, node })
      until(spec.lasts, `replication slow${node === undefined ? '' : ` to ${nodeName(node)}`}`, () =>
        network.slow.delete(run),
      )
      return
    }
    case 'lost-invalidations':
      cache!.losses.set(run, spec.share)
      until(spec.lasts, `${percent(spec.share)} of invalidations lost`, () => cache!.losses.delete(run))
  }
}

function stop(
  run: FaultRun,
  node: number,
  lasts: number,
  network: Network,
  until: (lasts: number, text: string, end: () => void) => void,
): void {
  if (network.stopped[node]) return
  network.stopped[node] = run
  until(lasts, `${nodeName(node)} stopped`, () => {
    network.stopped[node] = undefined
  })
}

function messages(of: 'requests' | 'answers' | 'both'): string {
  return of === 'both' ? 'requests and answers' : of
}

function percent(share: number): string {
  return `${Math.round(share * 100)}%`
}
