/**
 * The clocks that stamp a recording: each host's is off by something, and drifts.
 */
import type { Random } from './random.js'
import type { Scenario } from './scenario-schema.js'

/** When every rehearsal starts, seconds since the epoch: 2024-07-01T10:33:20Z. */
const START_S = 1_719_830_000
const SECOND = 1_000_000_000

export class Clocks {
  /** ns at the start, and ns a second, by host */
  readonly offsets: readonly number[]
  readonly drifts: readonly number[]

  constructor({ clocks, workload }: Scenario, random: Random) {
    const hosts = Math.min(workload.hosts, workload.clients)
    this.offsets = Array.from({ length: hosts }, () => random.around(clocks.off))
    this.drifts = Array.from({ length: hosts }, () => random.around(clocks.drift))
  }

  hostOf(client: number): number {
    return client % this.offsets.length
  }

  /** How far a host's clock is from true time then, ns. */
  error(host: number, time: number): number {
    return this.offsets[host] + Math.floor((time / SECOND) * this.drifts[host])
  }

  /** What a host's clock says at a true time, ns since the epoch as digits. */
  stamp(host: number, time: number): string {
    return this.text(time + this.error(host, time))
  }

  /** A true time as ns since the epoch, in digits. */
  text(time: number): string {
    const seconds = Math.floor(time / SECOND)
    return `${START_S + seconds}${String(time - seconds * SECOND).padStart(9, '0')}`
  }
}
