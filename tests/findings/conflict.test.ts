/**
 * Counterexamples where reads do not say which write they saw: broken by the definition, irreducible, and from closed
 * subsets only, so that what was left out explains nothing away.
 */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { check } from '../../src/findings/check.js'
import { closedSubsets } from '../../src/findings/closed-subsets.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { countPairs } from '../../src/order/counting.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import { parsePromise } from '../../src/promises/parse-request.js'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { bruteForce, type PlainKey } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { PLAIN_RULES, programRule } from '../oracles/rules.js'

const SEARCHED: Family[] = ['ambiguous', 'sizes', 'mixed']

function parseKey(text: string): PlainKey {
  const [header, ...operations] = text
    .trim()
    .split('\n')
    .map((line) => JSON.parse(line))
  return {
    operations,
    clockError: header.clockError ?? 0,
    ...(header.initial ? { initial: header.initial.k } : {}),
    ...(header.initialUnknown ? { initialUnknown: true } : {}),
  }
}

describe('what is left out of a counterexample explains nothing away', () => {
  // Under durable which reads are closing depends on what is left.
  const rules = PLAIN_RULES.filter(({ promise }) => promise !== 'durable')

  it.each(['ambiguous', 'mixed'] as Family[])('on %s keys', async (family) => {
    let tried = 0
    await fc.assert(
      fc.asyncProperty(
        tinyKey(family),
        fc.nat(rules.length - 1),
        fc.infiniteStream(fc.nat(1000)),
        async (key, which, random) => {
          const plain = rules[which]
          const hasIncrements = key.operations.some(({ op }) => op === 'increment')
          if ((plain.versions !== undefined && hasIncrements) || !bruteForce(key, plain)) return
          const history = await readHistory([textSource('tiny', keyText(key))])
          const gathered = gatherKey(history, indexByKey(history), 0, history.clockErrorNs)
          const dependents = closedSubsets(countPairs(gathered, programRule(plain)), history.values)
          const kept = new Set(gathered.operation)
          const gone = [...kept].filter(() => (random.next().value as number) % 3 === 0)
          for (const i of gone) kept.delete(i)
          for (let i = gone.pop(); i !== undefined; i = gone.pop())
            for (const other of dependents(i, kept)) if (kept.delete(other)) gone.push(other)
          if (kept.size === 0 || kept.size === gathered.n) return
          tried++
          const rest = { ...key, operations: key.operations.filter((_, i) => kept.has(i)) }
          // What kind a key is goes by all of its records.
          const increments = rest.operations.some(({ op }) => op === 'increment')
          if (increments !== hasIncrements) return
          expect(bruteForce(rest, plain), `${JSON.stringify(plain)}\n${keyText(key)}\n${keyText(rest)}`).toBe(
            true,
          )
        },
      ),
      { numRuns: runs(4000) },
    )
    expect(tried).toBeGreaterThan(300)
  })
})

/** What is left of a key, still the kind of key that it was: refused operations tell no more than that. */
function ofTheKindOf(whole: PlainKey, rest: PlainKey): PlainKey {
  const refused = { client: 'refused', key: 'k', start: 0, end: 0, outcome: 'refused' } as const
  const operations = [...rest.operations]
  if (whole.operations.some(({ op }) => op === 'increment')) operations.push({ ...refused, op: 'increment' })
  if (whole.operations.some(({ op }) => op !== 'increment' && op !== 'read'))
    operations.push({ ...refused, op: 'write', value: 'never there' })
  return { ...rest, operations }
}

/** The counterexample without each of its operations, and what must go along. */
async function withoutEach(text: string, key: PlainKey, whole: PlainKey): Promise<PlainKey[]> {
  const history = await readHistory([textSource('counterexample', text)])
  const gathered = gatherKey(history, indexByKey(history), 0, history.clockErrorNs)
  // What kind a key is, and so what may explain its reads, goes by all of its records.
  const hasIncrements = whole.operations.some(({ op }) => op === 'increment')
  const hasWrites = whole.operations.some(({ op }) => op !== 'increment' && op !== 'read')
  const dependents = closedSubsets(
    countPairs({ ...gathered, hasIncrements, hasWrites }, programRule({ promise: 'linearizable' })),
    history.values,
  )
  const rests: PlainKey[] = []
  for (const removed of gathered.operation) {
    const kept = new Set(gathered.operation)
    const gone = [removed]
    for (let i = gone.pop(); i !== undefined; i = gone.pop()) {
      kept.delete(i)
      for (const other of dependents(i, kept)) if (kept.delete(other)) gone.push(other)
    }
    const operations = key.operations.filter((_, i) => kept.has(i))
    // A count that the header starts from belongs to a starting read, which stays.
    const isStart = key.initial !== undefined && key.operations[removed].op === 'read'
    if (!isStart) rests.push({ ...key, operations })
  }
  return rests
}

describe('counterexamples of searched keys', () => {
  it.each(SEARCHED)(
    'of %s keys are broken by the definition, and mended by any operation less',
    async (family) => {
      let seen = 0
      await fc.assert(
        fc.asyncProperty(tinyKey(family), async (key) => {
          const plain = { promise: 'linearizable' }
          if (bruteForce(key, plain)) return
          const source = textSource('tiny', keyText(key))
          const { result, counterexamples } = await check(await readHistory([source]), [source], {
            promises: [parsePromise('linearizable')],
            counterexamples: 20,
          })
          expect(result.promises[0].verdict).toBe('broken')
          expect(result.findings.length).toBeGreaterThan(0)
          for (const { path, text } of counterexamples) {
            seen++
            const found = parseKey(text)
            expect(bruteForce(found, plain), `${keyText(key)}\n${text}`).toBe(false)
            // What offered a value that nobody wrote stays for whoever reads it.
            if (/torn-row|refused-write-seen/.test(path)) continue
            for (const rest of await withoutEach(text, found, key)) {
              const isMended = bruteForce(rest, plain) || bruteForce(ofTheKindOf(key, rest), plain)
              expect(isMended, `${keyText(key)}\n${text}\n${keyText(rest)}`).toBe(true)
            }
          }
          expect(counterexamples.length, keyText(key)).toBeGreaterThan(0)
        }),
        { numRuns: runs(400) },
      )
      expect(seen).toBeGreaterThan(100)
    },
  )
})
