/**
 * Random quorums, against what is known of them: a read quorum misses the newest write with probability
 * C(N−W, R) / C(N, R), and returns one of the last k versions with 1 − that to the k (Bailis et al. 2012).
 */
import { describe, expect, it } from 'vitest'
import { QUORUMS } from '../published/pbs.js'
import { checked, play, scenario } from './play.js'

/** Four standard deviations: an interval misses once in sixteen thousand. */
const Z = 4
const MOST_VERSIONS = 10

/** Wilson's interval for a share (Wilson 1927). */
function wilson(successes: number, trials: number): [lower: number, upper: number] {
  const p = successes / trials
  const middle = p + Z ** 2 / (2 * trials)
  const half = Z * Math.sqrt((p * (1 - p)) / trials + Z ** 2 / (4 * trials * trials))
  return [(middle - half) / (1 + Z ** 2 / trials), (middle + half) / (1 + Z ** 2 / trials)]
}

/** Reads while no write was in flight: how many versions behind each one is, counted from the recording. */
function versionsBehind(history: string): number[] {
  const records = history
    .trimEnd()
    .split('\n')
    .slice(1)
    .map((line) => JSON.parse(line))
    .map((record) => ({ ...record, start: BigInt(record.start), end: BigInt(record.end) }))
  const behind: number[] = []
  for (const key of new Set(records.map((record) => record.key))) {
    const own = records.filter((record) => record.key === key)
    const writes = own.filter(({ op }) => op === 'write').sort((a, b) => (a.start < b.start ? -1 : 1))
    for (const read of own.filter(({ op }) => op === 'read')) {
      const before = writes.filter(({ end }) => end < read.start)
      const isAlone = writes.every(({ start, end }) => end < read.start || start > read.end)
      const isOrdered = before.every(({ start }, i) => i === 0 || before[i - 1].end < start)
      if (!isAlone || !isOrdered || before.length < MOST_VERSIONS) continue
      const found = before.findIndex(({ value }) => value === read.value)
      behind.push(found < 0 ? before.length : before.length - 1 - found)
    }
  }
  return behind
}

describe('random quorums that need not meet', () => {
  it.each(QUORUMS.filter(({ n }) => n <= 30))(
    'of $n nodes, $r read and $w written, miss the newest write as often as they should',
    ({ n, r, w, misses, within }) => {
      const what = scenario({
        store: {
          replication: 'leaderless',
          nodes: n,
          readQuorum: r,
          writeQuorum: w,
          spreads: false,
          network: '10us',
        },
        // One client's requests follow one another: nothing is in flight when it reads.
        workload: { lasts: '60s', clients: 1, berths: 20, sailings: 0, pause: '3ms', closingReads: 0 },
      })
      const behind = versionsBehind(play(what, n * 100 + r * 10 + w).history)
      expect(behind.length).toBeGreaterThan(5000)
      const missed = behind.filter((versions) => versions > 0).length
      if (misses === 0) return expect(missed).toBe(0)
      const [lower, upper] = wilson(missed, behind.length)
      expect(lower).toBeLessThan(misses)
      expect(upper).toBeGreaterThan(misses)
      for (const [k, share] of within) {
        const near = behind.filter((versions) => versions < k).length
        const [least, most] = wilson(near, behind.length)
        expect(least, `within ${k} versions`).toBeLessThanOrEqual(share)
        expect(most, `within ${k} versions`).toBeGreaterThanOrEqual(share)
      }
    },
  )

  it('say so in the truth, read by read', async () => {
    const what = scenario({
      store: {
        replication: 'leaderless',
        nodes: 3,
        readQuorum: 1,
        writeQuorum: 1,
        spreads: false,
        network: '10us',
      },
      workload: { lasts: '5s', clients: 1, berths: 2, sailings: 0, pause: '2ms', closingReads: 0 },
    })
    const { history, hits } = play(what, 5)
    const stale = new Set(hits.filter(({ effect }) => effect === 'stale').map(({ line }) => line))
    const newest = new Map<string, unknown>()
    const missed = new Set<number>()
    history
      .trimEnd()
      .split('\n')
      .forEach((text, i) => {
        const { op, key, value } = JSON.parse(text)
        if (op === 'write') newest.set(key, value)
        if (op === 'read' && value !== (newest.get(key) ?? null)) missed.add(i + 1)
      })
    expect(missed.size).toBeGreaterThan(300)
    expect(stale).toEqual(missed)
    const { findings } = await checked(history)
    expect(findings.length).toBeGreaterThan(0)
  })
})
