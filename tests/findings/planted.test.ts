import { describe, expect, it } from 'vitest'
import { ANOMALIES, plant } from '../oracles/planted.js'
import { checkText } from './story.js'

describe('planted anomalies among 100,000 sound operations', () => {
  it('are all found, under their names, and nothing else is', async () => {
    const { text, planted } = plant(100_000, 1000, 6, 20240701)
    expect(new Set(planted.values()).size).toBe(ANOMALIES.length)
    const { result } = await checkText(text, 'linearizable', 0)
    expect(result.history.operations).toBeGreaterThan(100_000)
    // The sound part has everything in it that could be taken for an anomaly.
    for (const kind of ['refused', 'unsure', 'cas', 'increments', 'reads'] as const)
      expect(result.history[kind]).toBeGreaterThan(1000)
    const found = new Map(result.findings.map(({ key, kind }) => [key, kind]))
    expect(new Map([...found].sort())).toEqual(new Map([...planted].sort()))
    expect(result.findings).toHaveLength(planted.size)
    expect(result.keys.map(({ key }) => key).sort()).toEqual([...planted.keys()].sort())
    expect(result.promises[0]).toMatchObject({ broken: planted.size, undecided: 0 })
  })

  it.each([
    'regular',
    'coherent',
    'durable',
    'bounded-staleness within=0ns versions=0',
    'no-lost-updates',
    'causal-convergence',
  ])('give no false alarm where nothing is planted, under %s', async (promise) => {
    const { text } = plant(20_000, 200, 0, 7)
    const { result } = await checkText(text, promise, 0)
    expect(result.promises[0].verdict).toBe('holds')
    expect(result.findings).toEqual([])
  })
})
