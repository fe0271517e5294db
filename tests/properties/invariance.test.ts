/** What must not change a verdict, and what may change it one way only. */
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { decideKey } from '../../src/deciders/decide-key.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import { parsePromise } from '../../src/promises/parse-request.js'
import { SINGLE_KEY_PROMISES } from '../../src/promises/promise.js'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import type { PlainKey, PlainOperation } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'

const PROMISES = SINGLE_KEY_PROMISES.map((name) =>
  name === 'bounded-staleness' ? `${name} within=2ns` : name,
)

async function verdicts(...texts: string[]): Promise<string[]> {
  const history = await readHistory(texts.map((text, i) => textSource(`f${i}`, text)))
  const key = gatherKey(history, indexByKey(history), 0, history.clockErrorNs)
  return PROMISES.map((promise) => decideKey(key, history.values, parsePromise(promise).rule!).verdict)
}

const someKey = fc.constantFrom<Family>('register', 'cas', 'counter').chain((family) => tinyKey(family, 8))
const map = (key: PlainKey, change: (op: PlainOperation) => PlainOperation): PlainKey => ({
  ...key,
  operations: key.operations.map(change),
})

describe('no verdict changes', () => {
  const SAME: [string, (key: PlainKey) => PlainKey][] = [
    [
      'when all times are shifted',
      (key) =>
        map(key, (op) => ({
          ...op,
          start: op.start + 1000,
          ...(op.end === undefined ? {} : { end: op.end + 1000 }),
        })),
    ],
    [
      'when clients and hosts are renamed',
      (key) =>
        map(key, (op) => ({
          ...op,
          client: `x${op.client}y`,
          ...(op.host ? { host: `on ${op.host}` } : {}),
        })),
    ],
    ['when the key is renamed', (key) => map(key, (op) => ({ ...op, key: 'k' }))],
  ]
  it.each(SAME)('%s', async (_, change) => {
    await fc.assert(
      fc.asyncProperty(someKey, async (key) => {
        expect(await verdicts(keyText(change(key))), keyText(key)).toEqual(await verdicts(keyText(key)))
      }),
      { numRuns: runs(200) },
    )
  })

  it('when values are renamed, each to one of its own', async () => {
    await fc.assert(
      fc.asyncProperty(tinyKey('cas', 8), async (key) => {
        const rename = (value: unknown): unknown =>
          value === null || value === undefined ? value : { was: value }
        const renamed = map(key, (op) => {
          const changed = { ...op }
          for (const field of ['value', 'expect', 'saw'] as const)
            if (field in op) changed[field] = rename(op[field])
          return changed
        })
        if (key.initial !== undefined) renamed.initial = rename(key.initial)
        expect(await verdicts(keyText(renamed)), keyText(key)).toEqual(await verdicts(keyText(key)))
      }),
      { numRuns: runs(200) },
    )
  })

  it('when a file is cut into several, or its lines stand in another order (each client in its own)', async () => {
    await fc.assert(
      fc.asyncProperty(someKey, fc.nat(7), async (key, cut) => {
        const [header, ...lines] = keyText(key).trimEnd().split('\n')
        const at = Math.min(cut, lines.length)
        const expected = await verdicts(keyText(key))
        const parts = [[header, ...lines.slice(0, at)], lines.slice(at)].map((part) =>
          part.map((line) => `${line}\n`).join(''),
        )
        expect(await verdicts(...parts), keyText(key)).toEqual(expected)
        const byClient = [...lines].sort((a, b) =>
          JSON.parse(a).client < JSON.parse(b).client
            ? -1
            : JSON.parse(a).client > JSON.parse(b).client
              ? 1
              : 0,
        )
        expect(await verdicts(`${[header, ...byClient].join('\n')}\n`), keyText(key)).toEqual(expected)
      }),
      { numRuns: runs(200) },
    )
  })
})

describe('a verdict changes one way only', () => {
  it('adding a read can only break', async () => {
    await fc.assert(
      fc.asyncProperty(someKey, fc.nat(20), fc.nat(5), async (key, start, pick) => {
        const values = key.operations.map(({ value }) => value).filter((value) => value !== undefined)
        const value = values.length > 0 ? values[pick % values.length] : null
        const read: PlainOperation = { client: 'another', op: 'read', key: 'k', value, start, end: start + 2 }
        const before = await verdicts(keyText(key))
        const after = await verdicts(keyText({ ...key, operations: [...key.operations, read] }))
        before.forEach((verdict, i) => {
          if (verdict === 'broken' && PROMISES[i] !== 'no-lost-updates')
            expect(after[i], `${PROMISES[i]}\n${keyText(key)}`).toBe('broken')
        })
      }),
      { numRuns: runs(300) },
    )
  })

  it('a weaker promise is never broken where a stronger one holds', async () => {
    const WEAKER: [string, string[]][] = [
      [
        'linearizable',
        [
          'regular',
          'coherent',
          'durable',
          'bounded-staleness within=2ns',
          'read-your-writes',
          'monotonic-reads',
          'writes-follow-reads',
          'monotonic-writes',
          'written-values',
        ],
      ],
      ['regular', ['durable', 'bounded-staleness within=2ns']],
      ['coherent', ['read-your-writes', 'monotonic-reads', 'writes-follow-reads', 'monotonic-writes']],
      ['read-your-writes', ['written-values']],
      ['monotonic-reads', ['written-values']],
      ['writes-follow-reads', ['written-values']],
    ]
    await fc.assert(
      fc.asyncProperty(someKey, async (key) => {
        const answers = await verdicts(keyText(key))
        const verdictOf = (name: string): string => answers[PROMISES.indexOf(name)]
        for (const [strong, weak] of WEAKER) {
          if (verdictOf(strong) !== 'holds') continue
          for (const name of weak)
            expect(verdictOf(name), `${strong} holds, ${name}\n${keyText(key)}`).toBe('holds')
        }
      }),
      { numRuns: runs(500) },
    )
  })
})
