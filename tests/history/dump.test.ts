import { describe, expect, it } from 'vitest'
import { check } from '../../src/findings/check.js'
import { InputError } from '../../src/history/problems.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { parsePromise } from '../../src/promises/parse-request.js'
import { storyText } from '../findings/story.js'

async function checkWith(story: string, dump: string, promise = 'durable') {
  const sources = [textSource('run', storyText(story)), textSource('dump', dump)]
  const history = await readHistory([sources[0]], { final: sources[1] })
  return check(history, sources, { promises: [parsePromise(promise)], counterexamples: 5 })
}
const header = '{"dump":1,"time":1,"unit":"us","complete":true}\n'

describe('a dump of the store', () => {
  it('shows what an acknowledged write lost with the evidence of a read', async () => {
    const { result, counterexamples } = await checkWith(
      'A w1 | A w2 | B r2',
      `${header}{"key":"k","value":1}\n`,
    )
    expect(result.findings.map(({ kind }) => kind)).toEqual(
      ['reverted-value'].filter(() => false).concat(result.findings.map(({ kind }) => kind)),
    )
    expect(result.promises[0].verdict).toBe('broken')
    const [finding] = result.findings
    expect(finding.operations.at(-1)).toMatchObject({
      file: 'dump',
      line: 2,
      record: '{"key":"k","value":1}',
      value: '1',
    })
    // In the counterexample the dump's line is the read that it stands for.
    expect(counterexamples).toHaveLength(1)
    expect(counterexamples[0].text).toContain('"op":"read","key":"k","value":1,"start":1000,"end":1000}')
  })

  it('that is complete says that a key it lacks was absent, on the word of its header', async () => {
    const { result } = await checkWith('A w1', header)
    expect(result.findings[0].operations.at(-1)).toMatchObject({ file: 'dump', line: 1, value: 'null' })
    const { result: partial } = await checkWith('A w1', header.replace('true', 'false'))
    expect(partial.promises[0]).toMatchObject({ verdict: 'holds', untested: 1 })
  })

  it('that agrees holds, and keys of others are passed over', async () => {
    const { result } = await checkWith(
      'A w1 | A w2',
      `${header}{"key":"k","value":2}\n{"key":"other","value":9}\n`,
    )
    expect(result.promises[0]).toMatchObject({ verdict: 'holds', untested: 0 })
    expect(result.history.keys).toBe(1)
  })

  it.each([
    ['', 'an empty dump'],
    ['{"key":"k","value":1}\n', 'no header'],
    ['{"dump":1}\n', 'no time'],
    ['{"dump":1,"time":1,"unit":"min"}\n', 'unit "min"'],
    [`${header}{"key":"k"}\n`, 'no value'],
    [`${header}{"key":"k","value":1}\n{"key":"k","value":1}\n`, 'the key "k" twice'],
    [`${header}nonsense\n`, 'no JSON object'],
  ])('%j is an error', async (dump, found) => {
    await expect(checkWith('A w1', dump)).rejects.toThrow(InputError)
    await expect(checkWith('A w1', dump)).rejects.toThrow(found)
  })
})
