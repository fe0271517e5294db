/**
 * Every broken key gets a finding, and every counterexample breaks the promise by definition, alone, with no
 * operation to spare.
 */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { bruteForce, type PlainKey, type PlainOperation } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { checkText, storyText } from './story.js'

function parse(text: string): PlainKey & { header: Record<string, unknown> } {
  const [header, ...operations] = text
    .trimEnd()
    .split('\n')
    .map((line) => JSON.parse(line))
  return {
    header,
    operations,
    clockError: header.clockError ?? 0,
    ...(header.initial ? { initial: header.initial.k } : {}),
    ...(header.initialUnknown ? { initialUnknown: true } : {}),
  }
}

/** What goes when one operation goes: of a write its readers, of an increment the reads that may include it. */
function without(key: PlainKey, gone: PlainOperation): PlainOperation[] {
  const isIncrement = gone.op === 'increment'
  const same = (a: unknown, b: unknown): boolean => JSON.stringify(a ?? null) === JSON.stringify(b ?? null)
  const removed = new Set([gone])
  for (let again = true; again; ) {
    again = false
    for (const op of key.operations) {
      if (removed.has(op)) continue
      const depends = [...removed].some((write) => {
        if (isIncrement) return op.op === 'read' || op.value !== undefined
        if (write.op === 'read') return false
        const seen =
          op.op === 'read'
            ? op.value
            : op.op === 'cas'
              ? op.applied === false
                ? op.saw
                : op.expect
              : undefined
        return seen !== undefined && same(seen, write.value)
      })
      if (depends) {
        removed.add(op)
        again = true
      }
    }
  }
  return key.operations.filter((op) => !removed.has(op))
}

describe.each(['register', 'cas', 'counter'] as Family[])('on random broken %s keys', (family) => {
  it('there is a finding, and its counterexample is broken and irreducible', async () => {
    let broken = 0
    await fc.assert(
      fc.asyncProperty(tinyKey(family, 8), async (key) => {
        const text = keyText(key)
        const { result, counterexamples } = await checkText(text)
        if (result.exit !== 1) {
          expect(result.findings).toEqual([])
          return
        }
        broken++
        expect(result.findings.length).toBeGreaterThan(0)
        expect(counterexamples.length, `every finding has a counterexample\n${text}`).toBe(
          result.findings.length,
        )
        for (const { text: example } of counterexamples) {
          const alone = parse(example)
          const all = text.split('\n')
          for (const line of example.trimEnd().split('\n').slice(1)) expect(all).toContain(line)
          expect(bruteForce(alone, { promise: 'linearizable' }), `${text}\n${example}`).toBe(false)
          // A register's operations one by one, with what depends on them. (A counter's are checked below.)
          if (family === 'counter') continue
          for (const op of alone.operations) {
            const rest = without(alone, op)
            expect(
              rest.length === 0 || bruteForce({ ...alone, operations: rest }, { promise: 'linearizable' }),
              `without ${JSON.stringify(op)}\n${example}`,
            ).toBe(true)
          }
        }
      }),
      { numRuns: runs(400) },
    )
    expect(broken).toBeGreaterThan(50)
  })
})

describe('the plain cases', () => {
  it('a stale read is three operations', async () => {
    const { counterexamples } = await checkText(storyText('A w1 | B r1 | A w2 | B r2 | C r1 | A w3 | B r3'))
    expect(counterexamples[0].text.trimEnd().split('\n')).toHaveLength(1 + 3)
  })

  it('a lost increment between two reads is three, and starts at the first of them', async () => {
    const { counterexamples } = await checkText(storyText('A i | A i | B r2 | A i | C r2 | A i'))
    const [header, ...operations] = counterexamples[0].text.trimEnd().split('\n')
    expect(JSON.parse(header)).toEqual({ history: 1, initial: { k: 2 } })
    expect(operations.map((line) => JSON.parse(line).op)).toEqual(['read', 'increment', 'read'])
  })
})

describe('under every promise', () => {
  it.each([
    'written-values',
    'read-your-writes',
    'monotonic-reads',
    'writes-follow-reads',
    'coherent',
    'bounded-staleness within=2ns',
    'bounded-staleness versions=0',
    'durable',
    'no-lost-updates',
    'regular',
  ])('a key broken under %s has a finding with a counterexample', async (promise) => {
    let broken = 0
    await fc.assert(
      fc.asyncProperty(
        fc.constantFrom<Family>('register', 'cas', 'counter').chain((family) => tinyKey(family, 8)),
        async (key) => {
          const text = keyText(key)
          const { result, counterexamples } = await checkText(text, promise)
          if (result.exit !== 1) return
          broken++
          expect(result.findings.length, text).toBeGreaterThan(0)
          expect(counterexamples.length, text).toBe(result.findings.length)
        },
      ),
      { numRuns: runs(300) },
    )
    expect(broken).toBeGreaterThan(3)
  })
})
