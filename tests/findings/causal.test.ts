import { describe, expect, it } from 'vitest'
import { checkText } from './story.js'

/** Steps `client op key value`, one after the other in the file; sessions are what counts. */
function text(...steps: string[]): string {
  return steps
    .map((step, i) => {
      const [client, op, key, value] = step.split(' ')
      return JSON.stringify({ client, op, key, value: JSON.parse(value), start: 10 * i, end: 10 * i + 5 })
    })
    .join('\n')
    .concat('\n')
}

describe('findings of causal', () => {
  it('a read behind what it depends on, across keys, with its path and the bad pattern', async () => {
    const { result } = await checkText(
      text('A write x 1', 'A write x 2', 'A write y 3', 'B read y 3', 'B read x 1'),
      'causal',
    )
    expect(result.promises[0]).toMatchObject({ verdict: 'broken', leftOut: 0 })
    expect(result.promises[0].broken).toBeUndefined()
    const [finding] = result.findings
    expect(finding).toMatchObject({ kind: 'causal-inversion', keys: ['x', 'y'], marginNs: 'unbounded' })
    expect(finding.key).toBeUndefined()
    expect(finding.summary).toContain('(bad pattern WriteCORead)')
    expect(new Set(finding.chain!.map(({ type, before, after }) => `${before} ${type} ${after}`))).toEqual(
      new Set([
        '0 session 1',
        '0 returned 4',
        '1 session 2',
        '2 returned 3',
        '3 session 4',
        '4 overwritten 1',
      ]),
    )
  })

  it.each([
    [
      ['A write x 1', 'A write y 2', 'B read y 2', 'B read x null'],
      'causal',
      ['causal-inversion'],
      'WriteCOInitRead',
    ],
    [['A read x 2', 'A write y 1', 'B read y 1', 'B write x 2'], 'causal', ['causal-inversion'], 'CyclicCO'],
    [
      ['A write x 1', 'A read x 2', 'B write x 2', 'B read x 1'],
      'causal-convergence',
      ['causal-inversion'],
      'CyclicCF',
    ],
    [['A write x 1', 'A read x 2', 'B write x 2', 'B read x 1'], 'causal', [], ''],
    [['A write x 1', 'B read x 7'], 'causal', ['unwritten-value'], 'nobody in this recording'],
  ])('%j under %s', async (steps, promise, kinds, words) => {
    const { result, counterexamples } = await checkText(text(...steps), promise)
    expect(result.findings.map(({ kind }) => kind)).toEqual(kinds)
    expect(counterexamples).toHaveLength(kinds.length)
    if (kinds.length > 0) expect(result.findings[0].summary).toContain(words)
    expect(result.keys).toEqual([])
  })

  it('says how many keys were left out, and is undecided when all are', async () => {
    const counter = '{"client":"A","op":"increment","key":"n","start":100,"end":101}\n'
    const { result } = await checkText(text('A write x 1') + counter, 'causal')
    expect(result.promises[0]).toMatchObject({ verdict: 'holds', leftOut: 1 })
    const { result: none } = await checkText(counter, 'causal')
    expect(none.promises[0].verdict).toBe('undecided')
    expect(none.undecided[0]).toMatchObject({ promise: 'causal' })
    expect(none.exit).toBe(3)
  })

  it('have counterexamples of which nothing can be spared', async () => {
    const noise = ['A write z 9', 'C read z 9', 'C write x 8']
    const steps = ['A write x 1', 'A write x 2', 'A write y 3', ...noise, 'B read y 3', 'B read x 1']
    const { counterexamples } = await checkText(text(...steps), 'causal')
    const [header, ...lines] = counterexamples[0].text.trimEnd().split('\n')
    expect(header).toBe('{"history":1}')
    // 1, overwritten by 2, on which 3 depends, which B had read.
    expect(lines).toHaveLength(5)
    for (const gone of lines) {
      const { op, key, value } = JSON.parse(gone)
      const rest = lines.filter((line) => {
        const record = JSON.parse(line)
        return (
          line !== gone &&
          !(op === 'write' && record.op === 'read' && record.key === key && record.value === value)
        )
      })
      const { result } = await checkText(`${[header, ...rest].join('\n')}\n`, 'causal')
      expect(result.promises[0].verdict, gone).toBe('holds')
    }
  })
})
