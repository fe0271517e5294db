import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { type Family, keyText, tinyKey } from '../oracles/arbitraries.js'
import { bruteForce, type PlainKey } from '../oracles/brute-force.js'
import { runs } from '../oracles/decide.js'
import { checkText, findingsOf } from './story.js'

const PROMISES = ['linearizable', 'regular', 'durable', 'bounded-staleness within=2ns'] as const
const plain = (promise: string) => {
  const [name, parameter] = promise.split(' ')
  return { promise: name, ...(parameter ? { within: 2 } : {}) }
}

describe('the margin of a broken key', () => {
  it.each(PROMISES)('under %s: broken at it, not one nanosecond above', async (promise) => {
    let bounded = 0
    await fc.assert(
      fc.asyncProperty(
        fc.constantFrom<Family>('register', 'cas', 'counter').chain((family) => tinyKey(family, 7)),
        async (key) => {
          const { result } = await checkText(keyText(key), promise)
          if (result.exit !== 1) return
          const margin = result.keys[0].marginNs![promise]
          const at = (clockError: number): boolean => bruteForce({ ...key, clockError }, plain(promise))
          if (margin === 'unbounded') {
            expect(at(100_000), keyText(key)).toBe(false)
          } else {
            bounded++
            expect(at(Number(margin)), `broken at ${margin}\n${keyText(key)}`).toBe(false)
            expect(at(Number(margin) + 1), `holds above ${margin}\n${keyText(key)}`).toBe(true)
          }
          // Evidence never claims to survive more than the key does.
          for (const finding of result.findings) {
            if (margin === 'unbounded') continue
            expect(finding.marginNs, keyText(key)).not.toBe('unbounded')
            expect(BigInt(finding.marginNs!)).toBeLessThanOrEqual(BigInt(margin))
          }
        },
      ),
      { numRuns: runs(600) },
    )
    expect(bounded).toBeGreaterThan(3)
  })

  it('moving every clock by at most the margin leaves it broken', async () => {
    let moved = 0
    await fc.assert(
      fc.asyncProperty(
        fc.constantFrom<Family>('register', 'counter').chain((family) => tinyKey(family, 7)),
        fc.infiniteStream(fc.integer({ min: -100, max: 100 })),
        async (key, shifts) => {
          if (key.clockError > 0) return
          const { result } = await checkText(keyText(key))
          if (result.exit !== 1) return
          const stated = result.keys[0].marginNs!.linearizable
          const margin = stated === 'unbounded' ? 50 : Number(stated)
          // One shift a clock: a named host's, or a client's own where it names none.
          const byClock = new Map<string, number>()
          const shiftOf = (clock: string): number => {
            if (!byClock.has(clock))
              byClock.set(clock, Math.round((margin * (shifts.next().value as number)) / 100))
            return byClock.get(clock)!
          }
          // A client that moves between hosts could be torn apart by moved clocks: keep to clients of one clock.
          const hosts = new Map<string, Set<string>>()
          for (const { client, host } of key.operations)
            hosts.set(client, (hosts.get(client) ?? new Set()).add(host ?? client))
          if ([...hosts.values()].some((clocks) => clocks.size > 1)) return
          const shifted: PlainKey = {
            ...key,
            clockError: 0,
            operations: key.operations.map((op) => {
              const shift = shiftOf(op.host ?? `own ${op.client}`)
              return {
                ...op,
                start: op.start + shift,
                ...(op.end === undefined ? {} : { end: op.end + shift }),
              }
            }),
          }
          moved++
          // True times within the margin of the recorded ones: deciding them with that clock error is broken.
          expect(bruteForce(shifted, { promise: 'linearizable' }), keyText(key)).toBe(false)
        },
      ),
      { numRuns: runs(400) },
    )
    expect(moved).toBeGreaterThan(30)
  })

  it('is told with each finding', async () => {
    // Ended at 25 and began at 30 on two clocks: with 2 ns either way it is certain, with 3 it is not.
    const [stale] = await findingsOf('A w1 | A w2 | C r1')
    expect(stale.marginNs).toBe('2')
    const [own] = await findingsOf('A w1 | A w2 | A r1')
    expect(own.marginNs).toBe('unbounded')
  })
})

describe('marks', () => {
  const story = (mark: string): string =>
    `{"mark":${mark}}\n{"client":"A","op":"write","key":"k","value":1,"start":1,"end":2}\n{"client":"C","op":"read","key":"k","value":null,"start":10,"end":20}\n`
  it.each([
    ['"m","start":15,"end":30', [{ mark: 'm', relation: 'during' }]],
    ['"m","start":15', [{ mark: 'm', relation: 'during' }]],
    ['"m","start":3,"end":4', [{ mark: 'm', relation: 'after', afterNs: '6' }]],
    ['"m","start":25', undefined],
  ])('%s', async (mark, expected) => {
    const { result } = await checkText(story(mark))
    expect(result.findings[0].marks).toEqual(expected)
  })
})

describe('what a broken key still upholds', () => {
  it('is told by its strongest promises', async () => {
    // Stale for another client, but every session sees its own order.
    const { result } = await checkText(
      ['A w1', 'A r1', 'A w2', 'A r2', 'C r1', 'A r2']
        .map((step, i) => {
          const [client, what] = step.split(' ')
          return JSON.stringify({
            client,
            op: what[0] === 'w' ? 'write' : 'read',
            key: 'k',
            value: Number(what[1]),
            start: 10 * i,
            end: 10 * i + 5,
          })
        })
        .join('\n')
        .concat('\n'),
    )
    expect(result.keys[0].upholds).toContain('coherent')
    expect(result.keys[0].upholds).not.toContain('read-your-writes')
    expect(result.keys[0].upholds).not.toContain('linearizable')
  })
})

describe('small margins', () => {
  it('are warned of, and only those', async () => {
    const warnings = async (text: string) => (await checkText(text)).result.warnings.map(({ code }) => code)
    const story = (gap: number, host: string): string =>
      `{"client":"A","op":"write","key":"k","value":1,"start":1,"end":2${host}}\n{"client":"C","op":"read","key":"k","value":null,"start":${gap},"end":${gap + 1}${host}}\n`
    expect(await warnings(story(1_000_000, ''))).toEqual(['small-margin'])
    expect(await warnings(story(20_000_000, ''))).toEqual([])
    // One clock stamped both: nothing to explain.
    expect(await warnings(story(1_000_000, ',"host":"h"'))).toEqual([])
  })
})
