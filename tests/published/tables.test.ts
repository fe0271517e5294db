/** The tables of published numbers follow from the formulas that their sources give: no slip of the pen in them. */
import { describe, expect, it } from 'vitest'
import { seededRandom } from '../oracles/random.js'
import { DELAYS, QUORUMS } from './pbs.js'
import { WILSON, Z } from './wilson.js'

describe('the table of Wilson intervals', () => {
  // Wilson 1927: (p + z²/2n ± z·√(p(1−p)/n + z²/4n²)) / (1 + z²/n)
  it.each(WILSON)(
    '$successes of $trials at $level',
    ({ successes, trials, level, lower, upper, published }) => {
      const z2 = Z[level] ** 2
      const p = successes / trials
      const middle = p + z2 / (2 * trials)
      const half = Z[level] * Math.sqrt((p * (1 - p)) / trials + z2 / (4 * trials * trials))
      expect((middle - half) / (1 + z2 / trials)).toBeCloseTo(lower, 6)
      expect((middle + half) / (1 + z2 / trials)).toBeCloseTo(upper, 6)
      if (published) {
        expect(lower).toBeCloseTo(published.lower, 4)
        expect(upper).toBeCloseTo(published.upper, 4)
      }
    },
  )
})

const choose = (n: number, k: number): number => (k === 0 ? 1 : k > n ? 0 : (choose(n - 1, k - 1) * n) / k)

describe('the table of quorum staleness', () => {
  // Bailis et al. 2012: p = C(n−w, r) / C(n, r); one of the last k with 1 − p^k.
  it.each(QUORUMS)('$n replicas, reads of $r, writes of $w', ({ n, r, w, misses, within }) => {
    const p = choose(n - w, r) / choose(n, r)
    expect(p).toBeCloseTo(misses, 6)
    if (misses > 0) expect(p / misses).toBeCloseTo(1, 5)
    for (const [k, share] of within) expect(1 - p ** k).toBeCloseTo(share, 6)
  })

  it.each(DELAYS)(
    'writes of mean $meanWriteMs ms read after $afterMs ms, simulated',
    ({ meanWriteMs, afterMs, paper, again }) => {
      const random = seededRandom(1)
      const delay = (mean: number): number => -mean * Math.log(1 - random())
      const trials = 20_000
      let fresh = 0
      for (let trial = 0; trial < trials; trial++) {
        const replicas = [0, 1, 2].map(() => ({
          write: delay(meanWriteMs),
          acknowledgement: delay(1),
          request: delay(1),
          response: delay(1),
        }))
        const committed = Math.min(...replicas.map(({ write, acknowledgement }) => write + acknowledgement))
        const total = ({ request, response }: (typeof replicas)[number]): number => request + response
        const first = replicas.reduce((a, b) => (total(b) < total(a) ? b : a))
        if (committed + afterMs + first.request >= first.write) fresh++
      }
      // Four standard errors of 20,000 trials, and the paper's rounding.
      const error = 4 * Math.sqrt((again * (1 - again)) / trials) + 0.0005
      expect(Math.abs(fresh / trials - again)).toBeLessThan(error)
      expect(Math.abs(fresh / trials - paper)).toBeLessThan(error + 0.01)
    },
  )
})
