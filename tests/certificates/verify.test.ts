/**
 * Whatever is decided is proved, whatever is proved is true by definition, and no change gets past the verifier.
 */
import { readFileSync } from 'node:fs'
import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { bruteForce, type PlainRule } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { lifelikeKey } from '../oracles/lifelike.js'
import { PLAIN_RULES } from '../oracles/rules.js'
import { certify, verify } from './certifying.js'

const FAMILIES: Family[] = ['register', 'cas', 'ambiguous', 'counter', 'sizes', 'mixed']
const HARBOUR = readFileSync(new URL('../../histories/harbour.ndjson', import.meta.url), 'utf8')

const typed = ({ promise, within, versions, settle }: PlainRule): string =>
  [
    promise,
    within === undefined ? '' : ` within=${within}ns`,
    versions === undefined ? '' : ` versions=${versions}`,
    settle === undefined ? '' : ` settle=${settle}ns`,
  ].join('')
const PROMISES = [...PLAIN_RULES.map(typed), 'no-lost-updates', 'causal', 'causal-convergence']

describe('what is decided is proved', () => {
  it.each(FAMILIES)('on short %s keys, and nothing is left unproved', async (family) => {
    await fc.assert(
      fc.asyncProperty(tinyKey(family), async (key) => {
        const text = keyText(key)
        const { lines, result } = await certify(text, PROMISES)
        const { refusals, unproved, proved, undecided } = await verify(lines, text)
        expect(refusals, `${text}${lines.join('\n')}`).toEqual([])
        expect(unproved).toBe(0)
        const decided = result.promises.filter(({ verdict }) => verdict === 'holds' || verdict === 'broken')
        expect(proved.holds + proved.broken + undecided).toBeGreaterThanOrEqual(decided.length)
        expect(undecided, text).toBe(result.undecided.length)
      }),
      { numRuns: runs(150) },
    )
  })

  it.each(FAMILIES)('on long %s keys, true or nearly so', async (family) => {
    // The smallest conflict of a long key of several sizes takes its time to find.
    const most = family === 'sizes' ? 60 : 120
    await fc.assert(
      fc.asyncProperty(lifelikeKey(family, { least: 40, most, bends: [0, 2] }), async ({ key }) => {
        const text = keyText(key)
        const { lines } = await certify(text, ['linearizable', 'coherent', 'causal'])
        const { refusals } = await verify(lines, text)
        expect(refusals, text).toEqual([])
      }),
      { numRuns: runs(30) },
    )
  })

  it('of the harbour, with every kind of finding in it', async () => {
    const { lines } = await certify(HARBOUR, PROMISES)
    const { refusals, proved, unproved } = await verify(lines, HARBOUR)
    expect(refusals).toEqual([])
    expect(unproved).toBe(0)
    expect(proved.broken).toBeGreaterThan(50)
    expect(proved.holds).toBeGreaterThan(100)
  })
})

describe('no false claim is accepted', () => {
  it.each(FAMILIES)('with its verdict turned round: %s keys', async (family) => {
    let turned = 0
    await fc.assert(
      fc.asyncProperty(
        tinyKey(family, 5),
        fc.nat(PLAIN_RULES.length - 1),
        fc.infiniteStream(fc.nat(1000)),
        async (key, which, random) => {
          const plain = PLAIN_RULES[which]
          const hasIncrements = key.operations.some(({ op }) => op === 'increment')
          if (plain.versions !== undefined && hasIncrements) return
          const text = keyText(key)
          const { lines } = await certify(text, [typed(plain)])
          const holds = bruteForce(key, plain)
          const all = key.operations.map((_, i) => i)
          // Any order at all for one that is broken; any few operations for one that holds.
          const pick = all.map((i) => ({ i, at: random.next().value as number })).sort((a, b) => a.at - b.at)
          const claim = holds
            ? {
                claim: 'broken',
                key: 'k',
                promises: [typed(plain)],
                counterexample: pick.filter(({ at }) => at < 700).map(({ i }) => i),
              }
            : { claim: 'holds', key: 'k', promises: [typed(plain)], order: pick.map(({ i }) => i) }
          turned++
          const forged = [lines[0], JSON.stringify(claim), lines.at(-1)!]
          const { refusals } = await verify(forged, text)
          expect(refusals.length, `${text}${forged.join('\n')}`).toBeGreaterThan(0)
        },
      ),
      { numRuns: runs(600) },
    )
    expect(turned).toBeGreaterThan(300)
  })

  it('with two counts that the increments do allow', async () => {
    await fc.assert(
      fc.asyncProperty(
        fc.constantFrom<Family>('counter', 'sizes').chain((family) => tinyKey(family, 5)),
        fc.nat(PLAIN_RULES.length - 1),
        fc.nat(5),
        fc.nat(5),
        async (key, which, from, to) => {
          const plain = PLAIN_RULES[which]
          if (plain.versions !== undefined || !bruteForce(key, plain)) return
          const text = keyText(key)
          const { lines } = await certify(text, [typed(plain)])
          const bounds = { ...(from === 5 ? {} : { from }), to }
          const claim = { claim: 'broken', key: 'k', promises: [typed(plain)], bounds }
          const { refusals } = await verify([lines[0], JSON.stringify(claim), lines.at(-1)!], text)
          expect(refusals.length, `${text}${JSON.stringify(claim)}`).toBeGreaterThan(0)
        },
      ),
      { numRuns: runs(1500) },
    )
  })
})

describe('a change to a certificate is refused, and where', () => {
  const change = (line: string, how: (record: Record<string, unknown>) => unknown): string =>
    JSON.stringify(how(JSON.parse(line)))
  const order = (record: Record<string, unknown>): number[] => record.order as number[]

  it.each<[string, (lines: string[]) => string[], RegExp]>([
    ['a line is gone', (lines) => lines.filter((_, i) => i !== 3), /says that there are|nothing is claimed/],
    [
      'a line is there twice',
      (lines) => [...lines.slice(0, 4), lines[3], ...lines.slice(4)],
      /earlier line spoke/,
    ],
    ['it is cut short', (lines) => lines.slice(0, -1), /cut short/],
    ['something follows', (lines) => [...lines, lines[1]], /behind the last line/],
    [
      'a digest differs',
      ([first, ...rest]) => [first.replace(/"sha256":"./, '"sha256":"'), ...rest],
      /header/,
    ],
    [
      'it is about other input',
      ([first, ...rest]) => [
        change(first, (header) => ({ ...header, inputs: [{ file: 'history', sha256: '0'.repeat(64) }] })),
        ...rest,
      ],
      /another SHA-256/,
    ],
    [
      'it counts other operations',
      ([first, ...rest]) => [first.replace('"operations":72', '"operations":71'), ...rest],
      /71 operations/,
    ],
    ['a line is no JSON', (lines) => [...lines.slice(0, 2), '{', ...lines.slice(3)], /not JSON/],
    [
      'a line is none of its kind',
      (lines) => [...lines.slice(0, 2), '{"claim":"perhaps"}', ...lines.slice(3)],
      /no claim/,
    ],
    [
      'a key is another',
      (lines) => lines.map((line) => line.replace('"key":"berth/1"', '"key":"berth/99"')),
      /not claimed for/,
    ],
  ])('%s', async (_, mutate, why) => {
    const { lines } = await certify(HARBOUR, ['linearizable'])
    expect((await verify(lines, HARBOUR)).refusals).toEqual([])
    const { refusals } = await verify(mutate([...lines]), HARBOUR)
    expect(refusals.map((refusal) => refusal.why).join('\n')).toMatch(why)
  })

  it('of an order: every swap that matters, every loss, every repetition', async () => {
    const { lines } = await certify(HARBOUR, ['linearizable'])
    let swapped = 0
    for (const [at, line] of lines.entries()) {
      const record = JSON.parse(line)
      if (record.claim !== 'holds') continue
      const forged = async (changed: number[]): Promise<number> => {
        const text = JSON.stringify({ ...record, order: changed })
        const { refusals } = await verify(
          lines.map((l, i) => (i === at ? text : l)),
          HARBOUR,
        )
        expect(refusals.every((refusal) => refusal.line === at + 1)).toBe(true)
        return refusals.length
      }
      expect(await forged(order(record).slice(1))).toBe(1)
      expect(await forged([...order(record), order(record)[0]])).toBe(1)
      expect(await forged([...order(record), 9999])).toBe(1)
      for (let i = 1; i < order(record).length; i++) {
        const changed = [...order(record)]
        ;[changed[i - 1], changed[i]] = [changed[i], changed[i - 1]]
        if ((await forged(changed)) === 1) swapped++
      }
    }
    expect(swapped).toBeGreaterThan(5)
  })

  it('of the history: every record that is changed', async () => {
    const { lines } = await certify(HARBOUR, ['linearizable'])
    const records = HARBOUR.trim().split('\n')
    for (let i = 1; i < records.length; i++) {
      const changed = records.map((record, at) =>
        at === i ? record.replace(/"(value|mark)":/, '"$1 ":') : record,
      )
      if (changed[i] === records[i]) continue
      const verification = await verify(lines, `${changed.join('\n')}\n`).catch(() => undefined)
      // Some records cannot be read without their value: that is a refusal, too.
      expect(verification?.refusals.length ?? 1).toBeGreaterThan(0)
    }
  })
})
