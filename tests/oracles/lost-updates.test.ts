import fc from 'fast-check'
import { describe, expect, it } from 'vitest'
import { noLostUpdates } from '../../src/promises/no-lost-updates.js'
import { judgeOf } from '../certificates/judging.js'
import { keyText } from './arbitraries.js'
import type { PlainKey, PlainOperation } from './brute-force.js'
import { decide, runs } from './decide.js'

type Update = PlainOperation & { basis?: unknown }

/** Updates over few values, absence among them, so that bases repeat and some stand alone. */
const draft = fc.record({
  kind: fc.constantFrom(
    'write',
    'write',
    'based',
    'based',
    'based',
    'cas',
    'cas',
    'failed',
    'read',
    'delete',
  ),
  value: fc.constantFrom(null, 0, 1, 2, 3, 4),
  base: fc.constantFrom(null, 0, 1, 7),
  outcome: fc.constantFrom<'acked' | 'unsure' | 'refused'>('acked', 'acked', 'acked', 'unsure', 'refused'),
})

/** By definition: give every applied update a version of its own, with the value that it was computed from. */
function someUpdateIsLost({ operations, initial, initialUnknown }: PlainKey): boolean {
  const writers = (operations as Update[]).filter(
    ({ op, outcome, applied }) =>
      op !== 'read' && outcome !== 'refused' && !(outcome === 'acked' && applied === false),
  )
  type Version = Update | 'the initial value' | `unknown: ${string}`
  const start = initialUnknown ? undefined : (initial ?? null)
  const versionsOf = (value: unknown): Version[] => [
    ...writers.filter((w) => (w.op === 'delete' ? null : w.value) === value),
    ...(start === value ? (['the initial value'] as const) : []),
  ]

  // An unsure write was seen where a read cannot have returned anything else; a cas then found its `expect` too.
  const seen = new Set<Version>()
  const see = (value: unknown): void => {
    const [version, another] = versionsOf(value)
    if (another !== undefined || typeof version !== 'object' || seen.has(version)) return
    seen.add(version)
    if (version.op === 'cas' && version.outcome === 'unsure') see(version.expect)
  }
  for (const { op, outcome, value, expect: expected, applied, saw } of operations) {
    if (outcome !== 'acked') continue
    if (op === 'read') see(value)
    if (op === 'cas' && applied !== false) see(expected)
    if (op === 'cas' && applied === false && saw !== undefined) see(saw)
  }

  const updates = writers
    .filter((w) => w.outcome === 'acked' || seen.has(w))
    .map((update) => ({ update, base: update.op === 'cas' ? update.expect : update.basis }))
    .filter(({ base }) => base !== undefined)
  const canBeGiven = (at: number, taken: readonly Version[]): boolean => {
    if (at === updates.length) return true
    const { update, base } = updates[at]
    const others = versionsOf(base).filter((version) => version !== update)
    const candidates: Version[] = others.length > 0 ? others : [`unknown: ${base}`]
    return candidates.some((version) => !taken.includes(version) && canBeGiven(at + 1, [...taken, version]))
  }
  return !canBeGiven(0, [])
}

describe('no-lost-updates', () => {
  it('agrees with giving every update a version of its own, and so does the verifier', async () => {
    const tally = { holds: 0, broken: 0 }
    await fc.assert(
      fc.asyncProperty(
        fc.array(draft, { minLength: 3, maxLength: 9, size: 'max' }),
        fc.constantFrom('none', 'given', 'unknown'),
        async (drafts, start) => {
          const operations = drafts.map(({ kind, value, base, outcome }, i): Update => {
            const common = { client: `c${i}`, key: 'k', start: i, end: i + 1, outcome }
            if (kind === 'delete') return { ...common, op: 'delete' }
            if (kind === 'read' || kind === 'write') return { ...common, op: kind, value }
            if (kind === 'based') return { ...common, op: 'write', value, basis: base }
            const cas = { ...common, op: 'cas' as const, value, expect: base }
            return kind === 'cas'
              ? cas
              : { ...cas, applied: false, ...(base === value ? {} : { saw: value }) }
          })
          const key: PlainKey = { operations, clockError: 0 }
          if (start === 'given') key.initial = 0
          if (start === 'unknown') key.initialUnknown = true
          const expected = someUpdateIsLost(key) ? 'broken' : 'holds'
          tally[expected]++
          const { verdict } = await decide(key, noLostUpdates)
          expect(verdict, keyText(key)).toBe(expected)
          expect((await judgeOf(key)).losesUpdates(), keyText(key)).toBe(expected === 'broken')
        },
      ),
      { numRuns: runs(2000) },
    )
    expect(Math.min(tally.holds, tally.broken)).toBeGreaterThan(0.15 * (tally.holds + tally.broken))
  })
})
