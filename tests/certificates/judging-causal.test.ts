/**
 * The verifier on promises over several keys, and on lost updates, against their definitions: every order of few
 * operations, every part of them.
 */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { causalOrderTrouble, hasBadPattern } from '../../src/certificates/verify/causal.js'
import { CausalKeys } from '../../src/certificates/verify/causal-keys.js'
import { Recorded } from '../../src/certificates/verify/recorded.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import {
  bruteForceCausal,
  type CausalOp,
  extendsCausality,
  isArbitration,
} from '../oracles/causal-brute-force.js'
import { runs } from '../oracles/decide.js'

const draft = fc.record({
  client: fc.constantFrom('a', 'b', 'c', 'd'),
  key: fc.constantFrom('x', 'x', 'x', 'x', 'x', 'y'),
  kind: fc.constantFrom<CausalOp['op']>('write', 'write', 'write', 'read', 'read', 'read', 'read', 'cas'),
  pick: fc.nat(11),
  unsure: fc.constantFrom(false, false, false, true),
})
type Draft = typeof draft extends fc.Arbitrary<infer T> ? T : never

/** Each value written once on its key; a read may return what is written later: time plays no part. */
function build(drafts: readonly Draft[]): CausalOp[] {
  return drafts.map(({ client, key, kind, pick, unsure }, at): CausalOp => {
    const written = drafts.flatMap((other, i) =>
      other.key === key && other.kind !== 'read' && i !== at ? [i + 1] : [],
    )
    const seen = [null, ...written, ...(pick > 10 ? [99] : [])].at(pick % (written.length + 1))
    if (kind === 'read') return { client, op: 'read', key, value: pick > 10 ? 99 : seen }
    const sure = unsure ? { unsure } : {}
    return { client, op: kind, key, value: at + 1, ...(kind === 'cas' ? { expect: seen } : {}), ...sure }
  })
}

function textOf(ops: readonly CausalOp[]): string {
  return ops
    .map(({ unsure, ...op }, i) =>
      JSON.stringify({ ...op, start: 10 * i, end: 10 * i + 5, ...(unsure ? { outcome: 'unsure' } : {}) }),
    )
    .join('\n')
    .concat('\n')
}

async function keysOf(ops: readonly CausalOp[]): Promise<CausalKeys> {
  const history = await readHistory([textSource('causal', textOf(ops))])
  const keys = new CausalKeys(new Recorded(history, 0n))
  for (let keyId = 0; keyId < history.keys.size; keyId++) {
    const all = ops.map((_, i) => i).filter((i) => history.key[i] === keyId)
    if (!keys.add(keyId, all)) throw new Error('values are written once')
  }
  return keys
}

function permutations(items: readonly number[]): number[][] {
  if (items.length === 0) return [[]]
  return items.flatMap((first) =>
    permutations(items.filter((item) => item !== first)).map((rest) => [first, ...rest]),
  )
}

describe('causal promises', () => {
  it('hold by an order exactly when it is a witness by definition', async () => {
    const tally = { causal: 0, convergence: 0, between: 0, refused: 0 }
    await fc.assert(
      fc.asyncProperty(fc.array(draft, { minLength: 3, maxLength: 5 }), async (drafts) => {
        const ops = build(drafts)
        const keys = await keysOf(ops)
        const { causal } = bruteForceCausal(ops)
        const all = ops.map((_, i) => i)
        const some = [...keys.takesPart]
        for (const order of [
          ...permutations(some),
          ...permutations(all),
          some.slice(1),
          [...some, ...some],
        ]) {
          const extending = extendsCausality(ops, order)
          const where = `${order}\n${textOf(ops)}`
          const isCausal = causalOrderTrouble(keys, order, false) === undefined
          const isConvergent = causalOrderTrouble(keys, order, true) === undefined
          expect(isCausal, where).toBe(causal && extending)
          expect(isConvergent, where).toBe(isArbitration(ops, order))
          if (isCausal) tally.causal++
          else tally.refused++
          if (isConvergent) tally.convergence++
          else if (isCausal) tally.between++
        }
      }),
      { numRuns: runs(800) },
    )
    expect(Math.min(...Object.values(tally))).toBeGreaterThan(100)
  })

  it('are broken by operations only where they are by definition, and then by all of them', async () => {
    const tally = { causal: 0, convergence: 0, apart: 0, parts: 0 }
    await fc.assert(
      fc.asyncProperty(fc.array(draft, { minLength: 6, maxLength: 9 }), async (drafts) => {
        const ops = build(drafts)
        const keys = await keysOf(ops)
        const expected = bruteForceCausal(ops)
        const all = ops.map((_, i) => i)
        const breaks = (operations: readonly number[], converges: boolean): boolean =>
          keys.unwritten.some((r) => operations.includes(r)) || hasBadPattern(keys, operations, converges)
        expect(breaks(all, false), textOf(ops)).toBe(!expected.causal)
        expect(breaks(all, true), textOf(ops)).toBe(!expected.convergence)
        if (!expected.causal) tally.causal++
        if (!expected.convergence) tally.convergence++
        if (expected.causal && !expected.convergence) tally.apart++
        for (const left of all) {
          const part = all.filter((i) => i !== left)
          if (breaks(part, false)) expect(expected.causal, textOf(ops)).toBe(false)
          if (!breaks(part, true)) continue
          expect(expected.convergence, textOf(ops)).toBe(false)
          tally.parts++
        }
      }),
      { numRuns: runs(2000) },
    )
    expect(Math.min(...Object.values(tally))).toBeGreaterThan(3)
  })
})
