import { describe, expect, it } from 'vitest'
import { plant } from '../oracles/planted.js'
import { checkText } from './story.js'

describe('planted anomalies among 100,000 sound operations', () => {
  it('are all found, under their names, and nothing else is', async () => {
    const { text, planted } = plant(100_000, 1000, 6, 20240701)
    const { result } = await checkText(text, 'linearizable', 0)
    expect(result.history.operations).toBeGreaterThan(100_000)
    const found = new Map(result.findings.map(({ key, kind }) => [key, kind]))
    expect(new Map([...found].sort())).toEqual(new Map([...planted].sort()))
    expect(result.findings).toHaveLength(planted.size)
    expect(result.keys.map(({ key }) => key).sort()).toEqual([...planted.keys()].sort())
    expect(result.promises[0]).toMatchObject({ broken: planted.size, undecided: 0 })
  })
})
