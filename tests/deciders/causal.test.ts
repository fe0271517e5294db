import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { decideCausal } from '../../src/deciders/causal/decide.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { indexByKey } from '../../src/order/key-history.js'
import type { CausalName } from '../../src/promises/request.js'
import { bruteForceCausal, type CausalOp } from '../oracles/causal-brute-force.js'
import { runs } from '../oracles/decide.js'
import { CAUSAL_CASES } from '../published/causal-cases.js'

/** Session order alone counts: times only say what a client did first. */
function text(ops: readonly CausalOp[], header: Record<string, unknown> = {}): string {
  const lines = ops.map(({ client, op, key, value, expect, unsure }, i) =>
    JSON.stringify({
      client,
      op,
      key,
      value,
      ...(op === 'cas' ? { expect } : {}),
      start: 10 * i,
      end: 10 * i + 5,
      ...(unsure ? { outcome: 'unsure' } : {}),
    }),
  )
  return `${[JSON.stringify({ history: 1, ...header }), ...lines].join('\n')}\n`
}

async function decide(historyText: string, promise: CausalName) {
  const history = await readHistory([textSource('causal', historyText)])
  return decideCausal(history, indexByKey(history), promise, () => true)
}

const draft = fc.record({
  client: fc.constantFrom('a', 'b', 'c', 'd'),
  key: fc.constantFrom('x', 'x', 'x', 'x', 'y'),
  kind: fc.constantFrom('write', 'write', 'write', 'read', 'read', 'read', 'read', 'read', 'read', 'cas'),
  pick: fc.nat(11),
  unsure: fc.constantFrom(false, false, false, true),
})

function build(
  drafts: { client: string; key: string; kind: string; pick: number; unsure: boolean }[],
): CausalOp[] {
  // Values first, so that a read may come before its write in the file: causality is about sessions.
  const values: Record<string, number[]> = { x: [], y: [] }
  drafts.forEach(({ kind, key }, i) => {
    if (kind !== 'read') values[key].push(i + 1)
  })
  return drafts.map(({ client, key, kind, pick, unsure }, i): CausalOp => {
    const seen = [null, ...values[key].filter((v) => v !== i + 1)][
      pick % (values[key].filter((v) => v !== i + 1).length + 1)
    ]
    if (kind === 'read') return { client, op: 'read', key, value: seen }
    // Now and then what an unsure cas expects was never there: it is broken when it was seen all the same.
    const expected = unsure && pick === 11 ? 99 : seen
    if (kind === 'cas')
      return { client, op: 'cas', key, expect: expected, value: i + 1, ...(unsure ? { unsure } : {}) }
    return { client, op: 'write', key, value: i + 1, ...(unsure ? { unsure } : {}) }
  })
}

describe('causal and causal-convergence', () => {
  it('agree with their definitions on random differentiated histories', async () => {
    const tally = { causal: [0, 0], convergence: [0, 0], apart: 0 }
    await fc.assert(
      fc.asyncProperty(fc.array(draft, { minLength: 5, maxLength: 9 }), async (drafts) => {
        const ops = build(drafts)
        const expected = bruteForceCausal(ops)
        const causal = await decide(text(ops), 'causal')
        const convergence = await decide(text(ops), 'causal-convergence')
        expect(causal.verdict, text(ops)).toBe(expected.causal ? 'holds' : 'broken')
        expect(convergence.verdict, text(ops)).toBe(expected.convergence ? 'holds' : 'broken')
        tally.causal[Number(expected.causal)]++
        tally.convergence[Number(expected.convergence)]++
        if (expected.causal !== expected.convergence) tally.apart++
      }),
      { numRuns: runs(3000) },
    )
    expect(Math.min(...tally.causal, ...tally.convergence)).toBeGreaterThan(200)
    expect(tally.apart).toBeGreaterThan(5)
  })

  it.each(CAUSAL_CASES)(
    '$id ($source)',
    async ({ id, history, causal, convergence, patterns, notDifferentiated }) => {
      const initial = id.startsWith('ALPHA') ? 1 : 0
      const ops = history.split(' ; ').flatMap((process): CausalOp[] => {
        const [client, steps] = process.split(': ')
        return steps.split(' ').map((step) => {
          const [, letter, key, value] = /^([wr])\((\w+)\)(\d+)$/.exec(step)!
          return { client, op: letter === 'w' ? 'write' : 'read', key, value: Number(value) }
        })
      })
      const keys = [...new Set(ops.map(({ key }) => key))]
      const historyText = text(ops, { initial: Object.fromEntries(keys.map((key) => [key, initial])) })
      const [cc, ccv] = [await decide(historyText, 'causal'), await decide(historyText, 'causal-convergence')]
      if (notDifferentiated) {
        // The initial value is written as well: keys on which it is read are left out, and what is left is not accused.
        expect(cc.causal.keysLeftOut).toBeGreaterThan(0)
        if (causal) expect(cc.verdict).not.toBe('broken')
        if (convergence) expect(ccv.verdict).not.toBe('broken')
        return
      }
      expect(cc.verdict).toBe(causal ? 'holds' : 'broken')
      expect(ccv.verdict).toBe(convergence ? 'holds' : 'broken')
      for (const { name } of cc.patterns) expect(patterns).toContain(name)
      for (const { name } of ccv.patterns) expect(patterns).toContain(name)
    },
  )

  it('says undecided where every key is left out', async () => {
    const { verdict, causal } = await decide(
      '{"client":"a","op":"increment","key":"n","start":1,"end":2}\n',
      'causal',
    )
    expect([verdict, causal.keysLeftOut]).toEqual(['undecided', 1])
  })
})
