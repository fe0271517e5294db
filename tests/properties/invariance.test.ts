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
import { lifelikeKey, shuffleLines } from '../oracles/lifelike.js'

const PROMISES = [
  ...SINGLE_KEY_PROMISES.filter((name) => name !== 'bounded-staleness'),
  'bounded-staleness within=0ns',
  'bounded-staleness within=2ns',
  'bounded-staleness versions=0',
  'bounded-staleness versions=1',
  'bounded-staleness within=2ns versions=1',
  'durable settle=3ns',
]

async function verdicts(...texts: string[]): Promise<string[]> {
  return verdictsOn('k', ...texts)
}

async function verdictsOn(name: string, ...texts: string[]): Promise<string[]> {
  const history = await readHistory(texts.map((text, i) => textSource(`f${i}`, text)))
  const key = gatherKey(history, indexByKey(history), history.keys.find(name), history.clockErrorNs)
  return PROMISES.map((promise) => decideKey(key, history.values, parsePromise(promise).rule!).verdict)
}

const someKey = fc.constantFrom<Family>('register', 'cas', 'counter').chain((family) =>
  fc.oneof(
    tinyKey(family, 8),
    lifelikeKey(family, { least: 2, most: 14, bends: [0, 3] }).map(({ key }) => key),
  ),
)
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

  it('when the key is renamed', async () => {
    await fc.assert(
      fc.asyncProperty(someKey, async (key) => {
        const renamed = keyText(key)
          .replaceAll('"key":"k"', '"key":"berth/7 \\u00e9"')
          .replace('"initial":{"k"', '"initial":{"berth/7 \u00e9"')
        expect(await verdictsOn('berth/7 \u00e9', renamed), keyText(key)).toEqual(
          await verdicts(keyText(key)),
        )
      }),
      { numRuns: runs(200) },
    )
  })

  it('when other clients use other keys', async () => {
    await fc.assert(
      fc.asyncProperty(someKey, someKey, async (key, other) => {
        const [, ...lines] = keyText(
          map(other, (op) => ({ ...op, key: 'another', client: `another ${op.client}` })),
        )
          .trimEnd()
          .split('\n')
        const [header, ...own] = keyText(key).trimEnd().split('\n')
        const mixed = lines.flatMap((line, i) => [line, ...own.slice(i, i + 1)])
        const text = [header, ...mixed, ...own.slice(lines.length)].map((line) => `${line}\n`).join('')
        expect(await verdicts(text), text).toEqual(await verdicts(keyText(key)))
      }),
      { numRuns: runs(200) },
    )
  })

  it('when its lines stand in another order, each client in its own', async () => {
    await fc.assert(
      fc.asyncProperty(someKey, fc.array(fc.nat(), { minLength: 14, maxLength: 14 }), async (key, places) => {
        const shuffled = { ...key, operations: shuffleLines(key.operations, places) }
        expect(await verdicts(keyText(shuffled)), keyText(key)).toEqual(await verdicts(keyText(key)))
      }),
      { numRuns: runs(200) },
    )
  })

  it('when a file is cut into several, the last with its times in another unit', async () => {
    await fc.assert(
      fc.asyncProperty(someKey, fc.nat(14), fc.nat(14), async (key, one, two) => {
        const [header, ...lines] = keyText(key).trimEnd().split('\n')
        const [first, second] = [one, two].map((at) => Math.min(at, lines.length)).sort((a, b) => a - b)
        const inMicroseconds = (line: string): string =>
          line.replace(/"(start|end)":(\d+)/g, (_, name, ns) => `"${name}":${ns}e-3`)
        const last = `${JSON.stringify({ ...JSON.parse(header), clockError: 0, unit: 'us' })}\n`
        const parts = [
          [header, ...lines.slice(0, first)].map((line) => `${line}\n`).join(''),
          lines
            .slice(first, second)
            .map((line) => `${line}\n`)
            .join(''),
          last +
            lines
              .slice(second)
              .map((line) => `${inMicroseconds(line)}\n`)
              .join(''),
        ]
        expect(await verdicts(...parts), `${first} ${second}\n${keyText(key)}`).toEqual(
          await verdicts(keyText(key)),
        )
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
          if (verdict === 'broken') expect(after[i], `${PROMISES[i]}\n${keyText(key)}`).toBe('broken')
        })
      }),
      { numRuns: runs(300) },
    )
  })

  it('a weaker promise is never broken where a stronger one holds', async () => {
    const sessions = ['read-your-writes', 'monotonic-reads', 'writes-follow-reads', 'monotonic-writes']
    const WEAKER: [string, string[]][] = [
      ['linearizable', ['regular', 'coherent', ...sessions, 'bounded-staleness versions=0']],
      [
        'regular',
        ['durable', 'bounded-staleness within=0ns', 'bounded-staleness versions=0', 'written-values'],
      ],
      ['coherent', sessions],
      ...sessions.map((session): [string, string[]] => [session, ['written-values']]),
      ['durable', ['durable settle=3ns']],
      ['durable settle=3ns', ['written-values']],
      ['bounded-staleness within=0ns', ['bounded-staleness within=2ns']],
      ['bounded-staleness within=2ns', ['written-values']],
      ['bounded-staleness versions=0', ['bounded-staleness versions=1']],
      [
        'bounded-staleness within=2ns versions=1',
        ['bounded-staleness within=2ns', 'bounded-staleness versions=1'],
      ],
    ]
    await fc.assert(
      fc.asyncProperty(someKey, async (key) => {
        const answers = await verdicts(keyText(key))
        const verdictOf = (name: string): string => answers[PROMISES.indexOf(name)]
        for (const [strong, weak] of WEAKER) {
          if (verdictOf(strong) !== 'holds') continue
          for (const name of weak)
            expect(['holds', 'left-out'], `${strong} holds, ${name}\n${keyText(key)}`).toContain(
              verdictOf(name),
            )
        }
      }),
      { numRuns: runs(500) },
    )
  })
})
