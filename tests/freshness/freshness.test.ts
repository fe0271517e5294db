/**
 * Freshness held to its definition (docs/freshness.md), to published intervals and to a statistics library.
 */
import fc from 'fast-check'
import { quantileRankSorted, quantileSorted } from 'simple-statistics'
import { describe, expect, it } from 'vitest'
import { freshnessSchema, rank, sumUp } from '../../src/freshness/figures.js'
import { measureFreshness } from '../../src/freshness/measure.js'
import { takeSamples } from '../../src/freshness/samples.js'
import { wilson } from '../../src/freshness/wilson.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { indexByKey } from '../../src/order/key-history.js'
import { misread } from '../cli/in-process.js'
import { type Family, keyText } from '../oracles/arbitraries.js'
import type { PlainKey } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { lifelikeKey } from '../oracles/lifelike.js'
import { type Operation, precedes, readKey } from '../oracles/plain-pairs.js'
import { WILSON } from '../published/wilson.js'

interface Judged {
  readonly age: number
  readonly stale: number
  readonly behind: number
}

/** By the letter: every write is held against every read. Undefined: left out. */
function judge(key: PlainKey, all: readonly Operation[], r: Operation): Judged | undefined {
  const value = (v: unknown): string => JSON.stringify(v ?? null)
  const saw = value(r.op === 'read' ? r.value : r.saw)
  const writers = all.filter(
    (w) => w.writes && w.outcome !== 'refused' && value(w.op === 'delete' ? null : w.value) === saw,
  )
  const isInitial = value(key.initial) === saw
  if (writers.length + Number(isInitial) !== 1) return undefined
  const [v] = writers
  if (v && precedes(key, r, v)) return undefined
  const done = all.filter((w) => w.acked && w.writes && precedes(key, w, r))
  const over = done.filter((w) => w !== v && (!v || precedes(key, v, w)))
  const age = r.start - Math.max(...done.map((w) => w.end!))
  return {
    age,
    stale: over.length === 0 ? 0 : r.start - Math.min(...over.map((w) => w.end!)),
    behind: over.length,
  }
}

describe('how fresh a read was', () => {
  it.each(['register', 'cas'] as Family[])('is what the definition says, on %s keys', async (family) => {
    let stale = 0
    await fc.assert(
      fc.asyncProperty(lifelikeKey(family, { least: 5, most: 40, bends: [0, 4] }), async ({ key }) => {
        if (key.initialUnknown) return
        const { all } = readKey(key)
        const history = await readHistory([textSource('f', keyText(key))])
        const samples = takeSamples(history, indexByKey(history), history.clockErrorNs, () => true)
        const taken = new Map<number, Judged>()
        for (let i = 0; i < samples.count; i++) {
          taken.set(samples.operation[i], {
            age: samples.isAfterWrite[i] ? Number(samples.ageNs[i]) : Number.POSITIVE_INFINITY,
            stale: Number(samples.staleNs[i]),
            behind: samples.behind[i],
          })
          stale += samples.isStale[i]
        }
        const reads = all.filter(
          (op) =>
            op.acked &&
            (op.op === 'read' || (op.op === 'cas' && op.applied === false && op.saw !== undefined)),
        )
        expect([...taken.keys()].sort()).toEqual(
          reads
            .filter((r) => judge(key, all, r))
            .map(({ at }) => at)
            .sort(),
        )
        for (const r of reads) {
          const expected = judge(key, all, r)
          if (expected) expect(taken.get(r.at), `${r.at}\n${keyText(key)}`).toEqual(expected)
        }
      }),
      { numRuns: runs(1000) },
    )
    expect(stale).toBeGreaterThan(100)
  })

  it('sums up to the curve, the answers and the quantiles', () => {
    fc.assert(
      fc.property(
        fc.array(
          fc.record({
            age: fc.constantFrom(500, 1500, 3_000_000, 7e9, Number.POSITIVE_INFINITY),
            behind: fc.nat(3),
          }),
          {
            minLength: 1,
            maxLength: 60,
          },
        ),
        (reads) => {
          const samples = {
            count: reads.length,
            operation: Int32Array.from(reads.keys()),
            isAfterWrite: Uint8Array.from(reads, ({ age }) => (age === Number.POSITIVE_INFINITY ? 0 : 1)),
            ageNs: Float64Array.from(reads, ({ age }) => age),
            staleNs: Float64Array.from(reads, ({ behind }, i) => (behind > 0 ? 10 * i + 1 : 0)),
            behind: Int32Array.from(reads, ({ behind }) => behind),
            isStale: Uint8Array.from(reads, ({ behind }) => (behind > 0 ? 1 : 0)),
            leftOut: { counters: 0, ambiguous: 0, wrong: 0 },
          }
          const group = sumUp('all', samples, Int32Array.from(reads.keys()))
          const after = reads.filter(({ age }) => age !== Number.POSITIVE_INFINITY)
          expect(group.curve.reduce((n, bin) => n + bin.reads, 0)).toBe(after.length)
          for (const { fromNs, toNs, reads: n, fresh } of group.curve) {
            const inside = after.filter(
              ({ age }) => age >= Number(fromNs) && age < Number(toNs ?? Number.POSITIVE_INFINITY),
            )
            expect([n, fresh]).toEqual([inside.length, inside.filter(({ behind }) => behind === 0).length])
          }
          for (const [i, least] of [0.99, 0.999, 1].entries()) {
            const fits = [...new Set(after.map(({ age }) => age))]
              .sort((a, b) => a - b)
              .filter((from) => {
                const later = after.filter(({ age }) => age >= from)
                return later.filter(({ behind }) => behind === 0).length >= least * later.length
              })
            expect(group.answers[i].afterNs).toBe(fits.length > 0 ? `${fits[0]}` : undefined)
          }
        },
      ),
    )
  })

  it('takes nearest ranks: the library puts each where its share of the sample ends', () => {
    fc.assert(
      fc.property(
        fc.array(fc.integer({ min: 0, max: 1000 }), { minLength: 1, maxLength: 200 }),
        (numbers) => {
          const sorted = Float64Array.from(numbers).sort()
          for (const share of [0.5, 0.9, 0.99, 1]) {
            const value = rank(sorted, share)
            // simple-statistics: the share of the sample at or below a value of it.
            expect(quantileRankSorted([...sorted], value)).toBeGreaterThan(share - 0.5 - 1 / sorted.length)
            expect(sorted.filter((x) => x <= value).length / sorted.length).toBeGreaterThanOrEqual(share)
            expect(sorted.filter((x) => x < value).length / sorted.length).toBeLessThan(share)
          }
          // Of an odd sample its median is the middle one, by either definition.
          if (sorted.length % 2 === 1) expect(rank(sorted, 0.5)).toBe(quantileSorted([...sorted], 0.5))
        },
      ),
    )
  })
})

describe('the interval of a share', () => {
  it.each(WILSON.filter(({ level }) => level === 0.95))(
    '$successes of $trials',
    ({ successes, trials, lower, upper, published }) => {
      const { low, high } = wilson(successes, trials)
      expect(low).toBeCloseTo(lower, 5)
      expect(high).toBeCloseTo(upper, 5)
      if (published)
        expect([low.toFixed(4), high.toFixed(4)]).toEqual([
          published.lower.toFixed(4),
          published.upper.toFixed(4),
        ])
    },
  )
})

describe('misread freshness', () => {
  const REPLICA = 'histories/redis-replica.ndjson.gz'

  it('says how long after a write a replica may be read', async () => {
    const { status, out } = await misread(['freshness', REPLICA])
    expect(status).toBe(0)
    expect(out).toContain('How long after a write may I read?')
    expect(out).toMatch(/all reads {2}from [\d.]+ ms on/)
    expect(Math.max(...out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(100)
  })

  it('finds a primary fresh from the first moment', async () => {
    const { out } = await misread(['freshness', 'histories/redis-primary.ndjson.gz', '--format', 'json'])
    const { groups } = freshnessSchema.parse(JSON.parse(out))
    expect(groups[0].stale).toBe(0)
    expect(groups[0].answers.every(({ low }) => low! > 0.999)).toBe(true)
  })

  it.each(['key', 'client', 'mark'])('by %s divides the reads', async (by) => {
    const { out } = await misread(['freshness', 'histories/harbour.ndjson', '--by', by, '--format', 'json'])
    const [all, ...groups] = freshnessSchema.parse(JSON.parse(out)).groups
    const sum = groups.reduce((n, { reads }) => n + reads, 0)
    expect(sum).toBe(by === 'mark' ? 2 * all.reads : all.reads)
  })

  it('writes CSV and a picture that are what the JSON says', async () => {
    const csv = (await misread(['freshness', REPLICA, '--format', 'csv'])).out
    const { out } = await misread(['freshness', REPLICA, '--format', 'json'])
    const [group] = freshnessSchema.parse(JSON.parse(out)).groups
    expect(csv.trim().split('\r\n')).toHaveLength(1 + group.curve.length)
    const svg = (await misread(['freshness', REPLICA, '--format', 'svg'])).out
    expect(svg).toContain(`${group.stale} stale reads in all`)
    expect(svg.match(/<path/g)).toHaveLength(2)
  })

  it('measures as the library does', async () => {
    const history = await readHistory([
      textSource('f', '{"client":"a","op":"read","key":"k","value":null,"start":1,"end":2}\n'),
    ])
    expect(measureFreshness(history).groups).toMatchObject([{ reads: 1, afterWrite: 0, stale: 0, curve: [] }])
  })
})
