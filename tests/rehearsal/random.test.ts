import { describe, expect, it } from 'vitest'
import { type Random, randomStreams } from '../../src/rehearsal/random.js'

const random = (seed: number): Random => randomStreams(seed, 1)[0]
const COUNT = 100_000

describe('chance', () => {
  it('is the same for the same seed, and each stream is its own', () => {
    const draw = (stream: Random): number[] => Array.from({ length: 20 }, () => stream.below(1000))
    const [one, two] = randomStreams(7, 2)
    const first = draw(one)
    expect(draw(randomStreams(7, 2)[0])).toEqual(first)
    const second = draw(two)
    expect(second).not.toEqual(first)
    // What one stream is asked for does not change the other.
    expect(draw(randomStreams(7, 2)[1])).toEqual(second)
    expect(draw(random(8))).not.toEqual(first)
  })

  it('draws exponential delays of any mean', () => {
    // Exponential distribution: mean and standard deviation m, P(x > m·t) = e^−t. Five standard errors each.
    const mean = 1_000_000
    const stream = random(1)
    const values = Array.from({ length: COUNT }, () => stream.exponential(mean))
    const average = values.reduce((a, b) => a + b, 0) / COUNT / mean
    expect(Math.abs(average - 1)).toBeLessThan(5 / Math.sqrt(COUNT))
    for (const t of [0.1, 0.5, 1, 2, 4]) {
      const p = Math.exp(-t)
      const share = values.filter((value) => value > mean * t).length / COUNT
      expect(Math.abs(share - p), `beyond ${t}`).toBeLessThan(5 * Math.sqrt((p * (1 - p)) / COUNT))
    }
    expect(values.every(Number.isInteger)).toBe(true)
    expect(stream.exponential(0)).toBe(0)
  })

  it('chooses every set of nodes as often', () => {
    const stream = random(2)
    const counts = new Map<string, number>()
    for (let i = 0; i < COUNT; i++) {
      const set = stream.choose(2, 5)
      expect(new Set(set).size).toBe(2)
      const name = set.sort().join()
      counts.set(name, (counts.get(name) ?? 0) + 1)
    }
    // C(5, 2) sets; Pearson's chi-squared with 9 degrees of freedom is below 27.9 with probability 0.999 (tables).
    expect(counts.size).toBe(10)
    const expected = COUNT / 10
    const chi2 = [...counts.values()].reduce((sum, n) => sum + (n - expected) ** 2 / expected, 0)
    expect(chi2).toBeLessThan(27.9)
  })

  it('stays in its bounds', () => {
    const stream = random(3)
    for (let i = 0; i < 10_000; i++) {
      expect(Math.abs(stream.around(5))).toBeLessThanOrEqual(5)
      expect(stream.chance(0)).toBe(false)
      expect(stream.chance(1)).toBe(true)
    }
  })
})
