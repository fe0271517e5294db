/**
 * Clocks: a sound store is accused of nothing while they are off by no more than is stated; and what is seen when they
 * are off by more goes away once the truth about them is stated.
 */
import { describe, expect, it } from 'vitest'
import { checked, named, play, scenario } from './play.js'

interface HostLine {
  readonly host: string
  readonly offNs: number
  readonly driftNsPerSecond: number
  readonly isWithinStated: boolean
}

const hostsOf = (truth: string): HostLine[] =>
  truth
    .trimEnd()
    .split('\n')
    .map((line) => JSON.parse(line))
    .filter(({ host }) => host !== undefined)

describe('clocks off by less than is stated', () => {
  it('accuse nobody', async () => {
    for (let seed = 1; seed <= 100; seed++) {
      const { history, truth } = play(named('clocks-within'), seed)
      expect(hostsOf(truth).every(({ isWithinStated }) => isWithinStated)).toBe(true)
      expect((await checked(history)).findings, `seed ${seed}`).toEqual([])
    }
  })

  it('hide no loss that is larger', async () => {
    const what = scenario({
      store: { replication: 'async', lag: '50ms' },
      workload: { berths: 24 },
      clocks: { stated: '5ms', off: '5ms' },
      faults: [{ fault: 'failover', at: '2800ms' }],
    })
    const kinds = new Set<string>()
    for (let seed = 1; seed <= 10; seed++)
      for (const { kind } of (await checked(play(what, seed).history)).findings) kinds.add(kind)
    expect(kinds).toContain('lost-write')
  })
})

describe('clocks off by more than is stated', () => {
  it('accuse a sound store, of early reads too, and of nothing that survives the true error', async () => {
    const kinds = new Set<string>()
    for (let seed = 1; seed <= 20; seed++) {
      const { history, truth, account } = play(named('clocks-beyond'), seed)
      expect(account.hits).toEqual([])
      const hosts = hostsOf(truth)
      expect(hosts.some(({ isWithinStated }) => !isWithinStated)).toBe(true)
      // The rehearsal, its rest and the closing reads are over within 5 s.
      const worst = Math.max(
        ...hosts.map((host) => Math.abs(host.offNs) + 5 * Math.abs(host.driftNsPerSecond)),
      )
      const { findings } = await checked(history)
      for (const { kind, marginNs, summary } of findings) {
        kinds.add(kind)
        expect(marginNs, summary).toMatch(/^[0-9]+$/)
        expect(Number(marginNs), summary).toBeLessThan(worst)
      }
      expect((await checked(history, 'linearizable', BigInt(worst))).findings, `seed ${seed}`).toEqual([])
    }
    expect([...kinds]).toEqual(expect.arrayContaining(['early-read', 'stale-read']))
  })

  it('are stamped as the truth says', () => {
    const what = scenario({
      workload: { lasts: '1s', hosts: 2, clients: 2 },
      clocks: { off: '10ms', drift: '1ms' },
    })
    const exact = scenario({ workload: { lasts: '1s', hosts: 2, clients: 2 } })
    const { history, truth } = play(what, 3)
    const hosts = hostsOf(truth)
    const lines = history.trimEnd().split('\n').slice(1)
    const trueLines = play(exact, 3).history.trimEnd().split('\n').slice(1)
    expect(lines).toHaveLength(trueLines.length)
    expect(new Set(hosts.map(({ offNs }) => offNs)).size).toBe(2)
    lines.forEach((line, i) => {
      // Not through a double: the digits of the text itself.
      const stamp = (text: string): bigint => BigInt(/"start":(\d+)/.exec(text)![1])
      const { offNs, driftNsPerSecond } = hosts.find(({ host }) => line.includes(`"${host}"`))!
      const time = stamp(trueLines[i]) - 1_719_830_000_000_000_000n
      const error = offNs + Math.floor((Number(time) / 1e9) * driftNsPerSecond)
      expect(stamp(line) - stamp(trueLines[i])).toBe(BigInt(error))
    })
  })
})
